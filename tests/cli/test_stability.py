"""The command stability: tables, JSON, files, pictures, and its manners with bad input."""

from __future__ import annotations

import csv
import json
import re

import netCDF4
import numpy as np
import pytest
from typer.testing import CliRunner

from checks import assert_close, assert_published
from clockgeo.cli import app
from clockgeo.frequency import RecordLayout, write_record
from clockgeo.frequency.stability_statistics import STATISTICS
from clockgeo.times import SECOND_NS, tai_from_iso
from frequency.published_sets import OF_THOUSAND, thousand

START = tai_from_iso("2027-03-01T00:00:00Z")


def run(*words):
    return CliRunner().invoke(app, ["stability", *map(str, words)])


def written(folder, name, y, missing=()):
    """A record with one row a second; rows in `missing` are left out of the file."""
    kept = np.setdiff1d(np.arange(len(y)), missing)
    path = folder / name
    layout = RecordLayout(file=name)
    write_record(path, START + kept * SECOND_NS, np.asarray(y)[kept], layout=layout)
    return path


@pytest.fixture
def published(tmp_path):
    return written(tmp_path, "thousand.txt", thousand() * 1e-15)


@pytest.fixture
def gapped(tmp_path, rng):
    """White noise of 1e-16 at 1 s over 4000 s, a tenth of it missing and one gap of 500 s."""
    missing = np.union1d(np.arange(1_000, 1_500), rng.integers(0, 4_000, 400))
    return written(tmp_path, "gapped.txt", rng.normal(0.0, 1e-16, 4_000), missing)


def test_json_has_the_names_that_stay_and_the_published_digits(published):
    names = ",".join(OF_THOUSAND)
    result = run(published, "--statistic", names, "--tau", "1,10,100", "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)
    assert told["schema"] == "clockgeo/stability/1"
    assert [curve["statistic"] for curve in told["curves"]] == list(OF_THOUSAND)
    for curve in told["curves"]:
        printed = OF_THOUSAND[curve["statistic"]]
        assert [point["tau"] for point in curve["points"]] == [1.0, 10.0, 100.0]
        for point, text in zip(curve["points"], printed, strict=True):
            assert {"tau", "deviation", "lower", "upper", "edf", "noise", "count"} <= set(point)
            # The file holds values to a few 1e-22 of the 1e-15: six digits are left.
            assert_close(point["deviation"] * 1e15 / float(text), 1.0, tolerance=2e-6)
            assert point["lower"] < point["deviation"] < point["upper"]
    laws = ["white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm", "drift"]
    assert list(told["noise_model"]) == laws
    assert_published(told["mean"]["y"] * 1e15, "0.489774")
    assert told["mean"]["valid_seconds"] == told["mean"]["span_seconds"] == 1_000.0
    assert told["mean"]["uptime"] == 1.0


def test_white_noise_with_gaps_is_told_as_it_is(gapped):
    told = json.loads(run(gapped, "--json").stdout)
    assert told["noise_model"]["white_fm"] == pytest.approx(1e-16, rel=0.1)
    assert told["noise_model"]["flicker_fm"] is None
    valid = told["mean"]["valid_seconds"]
    # s/√N holds for white noise.
    assert told["mean"]["u"] == pytest.approx(1e-16 / np.sqrt(valid), rel=0.1)
    assert told["mean"]["uptime"] == pytest.approx(valid / told["mean"]["span_seconds"])
    points = told["curves"][0]["points"]
    assert points[-1]["tau"] == 512.0
    for point in points:
        # Four standard deviations of the deviation itself, 1/√(2 edf).
        expected = 1e-16 / np.sqrt(point["tau"])
        spread = 4.0 / np.sqrt(2.0 * point["edf"])
        assert point["deviation"] == pytest.approx(expected, rel=spread)


def test_a_record_split_at_a_gap_is_told_alike_in_either_order(tmp_path, rng):
    y = rng.normal(0.0, 1e-16, 600)
    early = written(tmp_path, "early.txt", y, np.arange(250, 600))
    late = written(tmp_path, "late.txt", y, np.arange(300))
    told = [json.loads(run(*files, "--json").stdout) for files in ((early, late), (late, early))]
    assert told[0]["records"] == told[1]["records"][::-1]
    assert [record["name"] for record in told[0]["records"]] == ["early.txt", "late.txt"]


def test_tables_for_people(gapped):
    result = run(gapped, "--statistic", "overlapping-allan,time", "--tau", "decade")
    assert result.exit_code == 0
    for words in ("overlapping-allan", "white fm", "u of the mean", "flicker floor is below"):
        assert words in result.stdout
    assert run(gapped, "--quiet").stdout == ""


def test_files_hold_what_json_tells(gapped, tmp_path):
    told = json.loads(run(gapped, "--json").stdout)
    points = told["curves"][0]["points"]
    for ending in ("csv", "json", "nc"):
        assert run(gapped, "--out", tmp_path / f"curve.{ending}", "--quiet").exit_code == 0
    assert json.loads((tmp_path / "curve.json").read_text()) == told
    with (tmp_path / "curve.csv").open() as stream:
        rows = list(csv.reader(stream))
    assert rows[0][:4] == ["record", "statistic", "tau (s)", "deviation"]
    assert [float(row[3]) for row in rows[1:]] == [point["deviation"] for point in points]
    with netCDF4.Dataset(tmp_path / "curve.nc") as dataset:
        found = dataset["overlapping_allan"][:]
        np.testing.assert_array_equal(found, [point["deviation"] for point in points])
        assert dataset["tau_overlapping_allan"].units == "s"
        assert dataset.u_of_mean == told["mean"]["u"]
        assert dataset.noise_model_white_fm == told["noise_model"]["white_fm"]


def test_nothing_is_overwritten_unless_asked(gapped, tmp_path):
    out = tmp_path / "curve.csv"
    out.write_text("mine")
    refused = run(gapped, "--out", out)
    assert refused.exit_code == 1
    assert "exists already" in refused.stderr
    assert out.read_text() == "mine"
    assert run(gapped, "--out", out, "--force", "--quiet").exit_code == 0
    assert out.read_text().startswith("record,")


def test_pictures_of_several_records(gapped, published, tmp_path):
    result = run(gapped, published, "--picture", tmp_path / "s.svg", "--quiet")
    assert result.exit_code == 0
    for number in (1, 2):
        text = (tmp_path / f"s-{number}.svg").read_text()
        assert "averaging time" in text
        assert "noise model" in text


def test_flywheel_adds_the_u_of_dead_time(tmp_path, rng):
    # Up in [0, 150] and [400, 550] of 1000 s: (h0/2)(1/T_u - 1/T) for white FM; the windows of the
    # worked example T = 10, U = [0, 1.5] and [4, 5.5], a hundred times longer: 0.1166667 h0/100.
    y = rng.normal(0.0, 1e-16, 1_000)
    up = np.r_[0:150, 400:550, 999]
    path = tmp_path / "part.txt"
    y[np.setdiff1d(np.arange(1_000), up[:-1])] = np.nan
    write_record(
        path, START + np.arange(1_000) * SECOND_NS, y, layout=RecordLayout(file="part.txt")
    )
    level = 1e-13
    result = run(path, "--flywheel", f"white_fm={level}", "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)["dead_time"]
    assert told["windows"] == 2
    assert_published(told["u"] ** 2 / (2.0 * level**2) * 100.0, "0.1166667")


def test_lambda_weighting_is_told(gapped):
    told = json.loads(run(gapped, "--weighting", "lambda", "--json").stdout)
    assert told["weighting"] == "lambda"
    assert told["noise_laws"]["short_times"] is False
    assert any("triangle (Λ)" in note for note in told["notes"])
    plain = json.loads(run(gapped, "--json").stdout)
    assert plain["weighting"] is None
    assert not any("Λ" in note for note in plain["notes"])


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--statistic", "median"], "no such statistic"),
        (["--tau", "1,1e9"], "out of reach of the record"),
        (["--out", "curve.xlsx"], "kind of file"),
    ],
)
def test_what_does_not_fit_is_an_error_of_data(gapped, words, told):
    result = run(gapped, *words)
    assert result.exit_code == 1
    assert told in " ".join(result.stderr.split())


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--tau", "now"], "neither octave"),
        (["--confidence", "95"], "between 0 and 1"),
        (["--flywheel", "white_fm"], "law=level"),
        (["--flywheel", "pink=1e-15"], "law=level"),
        (["--statistic", "allan,time", "--picture", "p.svg"], "do not share an axis"),
    ],
)
def test_wrong_words_are_wrong_usage(gapped, words, told):
    result = run(gapped, *words)
    assert result.exit_code == 2
    assert told in re.sub(r"[\s│]+", " ", result.stderr)


@pytest.mark.parametrize(
    ("values", "told"),
    [
        ([1e-16, 2e-16], "too few samples"),
        ([3e-16] * 50, "constant"),
        ([np.nan] * 50, "no row is usable"),
    ],
)
def test_records_that_show_nothing_are_refused(tmp_path, values, told):
    path = written(tmp_path, "bad.txt", values)
    result = run(path, "--json")
    assert result.exit_code == 1
    assert told in " ".join(result.stderr.split())
    assert result.stdout == ""


def test_help_names_every_option(monkeypatch):
    monkeypatch.setenv("COLUMNS", "200")
    told = run("--help").stdout
    for option in ("--statistic", "--tau", "--confidence", "--flywheel", "--picture", "--out"):
        assert option in told
    assert len(STATISTICS) == 10


def time_errors(folder, x, missing=()):
    """A file with one time error a second, in s with all digits."""
    kept = np.setdiff1d(np.arange(len(x)), missing)
    path = folder / "time-errors.txt"
    days = [f"{61_500 + int(k) / 86_400:.9f} {x[k]!r}" for k in kept]
    path.write_text("\n".join(days) + "\n", encoding="utf-8")
    return path


def test_time_errors_give_the_published_digits(tmp_path):
    x = np.concatenate(([0.0], np.cumsum(thousand() * 1e-15))).tolist()
    path = time_errors(tmp_path, x)
    names = ",".join(OF_THOUSAND)
    told = json.loads(
        run(
            path, "--value", "time_error", "--statistic", names, "--tau", "1,10,100", "--json"
        ).stdout
    )
    for curve in told["curves"]:
        for point, text in zip(curve["points"], OF_THOUSAND[curve["statistic"]], strict=True):
            assert_close(point["deviation"] * 1e15 / float(text), 1.0, tolerance=2e-6)


def test_time_errors_go_on_through_a_gap(tmp_path):
    """Second route: squares of every complete triple of time errors, gap or no gap between."""
    rng = np.random.default_rng(3)
    x = np.cumsum(1e-15 * rng.standard_normal(2_000)).tolist()
    missing = np.arange(900, 950)
    path = time_errors(tmp_path, x, missing)
    result = run(path, "--value", "time_error", "--tau", "64", "--json")
    assert result.exit_code == 0, result.output
    told = json.loads(result.stdout)
    kept = np.array(x)
    kept[missing] = np.nan
    second = kept[128:] - 2.0 * kept[64:-64] + kept[:-128]
    expected = np.sqrt(np.nanmean(second**2) / 2.0) / 64.0
    (point,) = told["curves"][0]["points"]
    assert point["deviation"] == pytest.approx(expected, rel=1e-9)
    assert point["count"] == np.count_nonzero(~np.isnan(second))


def test_time_errors_far_apart_or_with_a_place_in_the_gate_are_refused(tmp_path):
    path = time_errors(tmp_path, [0.0] * 40, np.arange(1, 40, 2))
    told = run(path, "--value", "time_error", "--interval", "1")
    assert told.exit_code == 1
    assert "no two time errors are one interval apart" in told.stderr
    told = run(path, "--value", "time_error", "--stamp", "end")
    assert told.exit_code == 2
    assert "time errors belong to the instant" in told.stderr.replace("\n", " ")
