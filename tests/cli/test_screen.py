"""The command screen: tables, JSON, files, and its manners with bad input."""

from __future__ import annotations

import csv
import json

import netCDF4
import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app
from clockgeo.frequency import RecordLayout, write_record
from clockgeo.times import SECOND_NS, tai_from_iso

START = tai_from_iso("2027-03-01T00:00:00Z")
SR_HZ = 429_228_004_229_872.99


def run(*words):
    return CliRunner().invoke(app, ["screen", *map(str, words)])


@pytest.fixture
def record(tmp_path, rng):
    """2000 s of white noise with an outlier at 500 s, a slip at 1000 s and 10 s without values."""
    y = rng.normal(0.0, 1e-16, 2_000)
    y[500] -= 3.5e-15
    y[1_000] += 2.0 / SR_HZ
    y[1_500:1_510] = np.nan
    path = tmp_path / "lab.txt"
    write_record(path, START + np.arange(2_000) * SECOND_NS, y, layout=RecordLayout(file="lab.txt"))
    return path


def test_json_is_one_object_with_the_names_that_stay(record):
    result = run(record, "--carrier", "87Sr", "--json")
    assert result.exit_code == 0
    told = json.loads(result.stdout)
    assert told["schema"] == "clockgeo/screen/1"
    assert told["counts"] == {
        "not_usable": 10,
        "out_of_bounds": 0,
        "outlier": 1,
        "cycle_slip": 1,
        "masked": 0,
    }
    assert told["rows"] == 2_000
    assert told["valid"] == 1_988
    assert [(epoch["time"], epoch["reasons"]) for epoch in told["epochs"]] == [
        ("2027-03-01T00:08:20.000Z", ["outlier"]),
        ("2027-03-01T00:16:40.000Z", ["cycle_slip"]),
    ]
    values = np.loadtxt(record)[:, 1]
    valid = np.isfinite(values)
    assert told["mean"]["without"] == pytest.approx(np.mean(values[valid]), rel=1e-12)
    valid[[500, 1_000]] = False
    assert told["mean"]["with"] == pytest.approx(np.mean(values[valid]), rel=1e-12)
    assert told["findings"] == []


def test_tables_name_counts_means_and_epochs(record):
    result = run(record)
    assert result.exit_code == 0
    for words in ("lab.txt: 2000 rows", "not usable", "with screening", "2027-03-01T00:08:20.000Z"):
        assert words in result.stdout


def test_quiet_prints_nothing(record):
    assert run(record, "--quiet").stdout == ""


def test_csv_holds_the_flagged_epochs(record, tmp_path):
    assert run(record, "--out", tmp_path / "flags.csv", "--quiet").exit_code == 0
    with (tmp_path / "flags.csv").open(newline="") as stream:
        rows = list(csv.reader(stream))
    assert rows[0] == ["record", "time (UTC)", "y (1)", "reasons"]
    assert [row[3] for row in rows[1:]] == ["outlier", "outlier"]


def test_netcdf_holds_every_epoch_with_cf_flags(record, tmp_path):
    assert run(record, "--out", tmp_path / "flags.nc", "--quiet").exit_code == 0
    with netCDF4.Dataset(tmp_path / "flags.nc") as dataset:
        reasons = dataset["reasons"]
        assert reasons.shape == (2_000,)
        outlier = dict(zip(reasons.flag_meanings.split(), reasons.flag_masks, strict=True))[
            "outlier"
        ]
        assert np.flatnonzero(reasons[:] & outlier).tolist() == [500, 1_000]


def test_a_json_file_holds_what_json_prints(record, tmp_path):
    printed = run(record, "--json", "--out", tmp_path / "flags.json").stdout
    assert (tmp_path / "flags.json").read_text() == printed


def test_several_records_at_once(record, tmp_path):
    other = tmp_path / "other.txt"
    other.write_bytes(record.read_bytes())
    told = json.loads(run(record, other, "--json").stdout)
    assert [each["name"] for each in told["records"]] == ["lab.txt", "other.txt"]
    refused = run(record, other, "--out", tmp_path / "flags.nc", "--quiet")
    assert refused.exit_code == 1
    assert "one record" in refused.stderr


def test_rules_and_masks_from_a_file(record, tmp_path):
    rules = tmp_path / "rules.toml"
    rules.write_text(
        "outlier_threshold = 50.0\n[[masks]]\nstart = 2027-03-01T00:00:00Z\n"
        'stop = 2027-03-01T00:01:00Z\nauthor = "A. N."\nreason = "door open"\n'
    )
    told = json.loads(run(record, "--rules", rules, "--json").stdout)
    assert told["counts"]["masked"] == 60
    assert told["counts"]["outlier"] == 0
    told = json.loads(run(record, "--rules", rules, "--threshold", "6", "--json").stdout)
    assert told["counts"]["outlier"] == 2


@pytest.mark.parametrize(
    ("text", "problem"),
    [
        ("window = -1.0", "window: Input should be greater than 0"),
        ("windw = 1.0", "windw: Extra inputs are not permitted"),
        ("window = ", "cannot read the screening rules"),
    ],
)
def test_wrong_rules_are_told(record, tmp_path, text, problem):
    rules = tmp_path / "rules.toml"
    rules.write_text(text + "\n")
    result = run(record, "--rules", rules)
    assert result.exit_code == 1
    assert problem in result.stderr


def test_an_existing_file_is_kept_unless_forced(record, tmp_path):
    out = tmp_path / "flags.csv"
    out.write_text("mine")
    refused = run(record, "--out", out, "--quiet")
    assert refused.exit_code == 1
    assert "exists already" in refused.stderr
    assert out.read_text() == "mine"
    assert run(record, "--out", out, "--quiet", "--force").exit_code == 0


@pytest.mark.parametrize(
    ("words", "code", "problem"),
    [
        (["absent.txt"], 1, "does not exist"),
        (["{record}", "--value", "ratio"], 1, "need the nominal ratio"),
        (["{record}", "--value", "ratio", "--nominal-ratio", "171Yb/87Sr"], 1, "right way up"),
        (["{record}", "--value-column", "9"], 1, "no such column: 9"),
        (["{record}", "--carrier", "87Srr"], 2, "Did you mean 87Sr"),
        (["{record}", "--nominal-ratio", "1/2/3"], 2, "not an exact decimal number"),
        (["{record}", "--nominal-ratio", "1/0"], 2, "must not be zero"),
        (["{record}", "--flag-column", "3"], 2, "belong together"),
        (["{record}", "--threshold", "1"], 2, "threshold"),
        (["{record}", "--interval", "-1"], 2, "interval"),
        (["{record}", "--out", "flags.xyz"], 1, ".csv, .json or .nc"),
        ([], 2, "Missing argument"),
    ],
)
def test_bad_input_has_its_exit_code_and_its_words(record, words, code, problem):
    result = run(*[word.format(record=record) for word in words])
    assert result.exit_code == code
    told = " ".join(result.stderr.replace("│", " ").split())
    assert problem in told
    assert "Traceback" not in result.output


def test_bad_rows_can_be_left_out(record):
    lines = record.read_text().splitlines()
    lines[7] = "what?"
    record.write_text("\n".join(lines) + "\n")
    refused = run(record)
    assert refused.exit_code == 1
    assert "line 8" in refused.stderr
    result = run(record, "--skip-bad-rows", "--json")
    assert "1 of 2000 rows cannot be used" in json.loads(result.stdout)["notes"][0]


def test_ratios_and_offsets_by_transition(tmp_path):
    (tmp_path / "r.txt").write_text(
        "60400.0 1.20750703934333785\n60400.00001157407407 1.20750703934333785\n"
    )
    told = run(tmp_path / "r.txt", "--value", "ratio", "--nominal-ratio", "171Yb/87Sr", "--json")
    # The 2021 frequencies give 1.207 507 039 343 337 848...: below one unit of the last digit.
    assert abs(json.loads(told.stdout)["mean"]["with"]) < 5e-18
    (tmp_path / "o.txt").write_text("60400.0 0.429228\n60400.00001157407407 0.429228\n")
    told = run(tmp_path / "o.txt", "--value", "offset", "--carrier", "429.228e12", "--json")
    assert json.loads(told.stdout)["mean"]["with"] == pytest.approx(1e-15, rel=1e-12)
