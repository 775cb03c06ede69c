"""The main job from the command line: what it writes, what it says, what it refuses."""

from __future__ import annotations

import hashlib
import json
import shutil
import subprocess
import sys

import netCDF4
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app

TRUTH = 19_132.80 - 5_501.90


def run(*words):
    return CliRunner().invoke(app, ["level", *map(str, words)])


@pytest.fixture
def saddle(project, tmp_path):
    """A copy of the shipped example that may be damaged."""
    return shutil.copytree(project / "examples" / "saddle", tmp_path / "saddle") / "campaign.toml"


@pytest.fixture(scope="module")
def levelled(project, tmp_path_factory):
    """The folder of results of the shipped example, and what was printed as JSON."""
    out = tmp_path_factory.mktemp("results")
    result = run(project / "examples" / "saddle" / "campaign.toml", "--out", out, "--json")
    assert result.exit_code == 0, result.stderr
    return out, json.loads(result.stdout)


def test_the_answer_holds_the_truth_it_was_drawn_from(levelled):
    difference = levelled[1]["differences"][0]
    error = difference["geopotential_difference"] - TRUTH
    assert (difference["from"], difference["to"]) == ("harbel", "kesselin")
    # A draw of 2.6 u or more happens once in a hundred; the shipped one is nothing special.
    assert abs(error) < 2.6 * difference["u"]
    assert 0.2 < difference["u"] < 1.0


def test_the_names_that_stay(levelled):
    told = levelled[1]
    assert told["schema"] == "clockgeo/level/1"
    for table, names in {
        "sessions": "id y u_statistical u_systematic u uptime valid_seconds tide_correction",
        "sites": "id geopotential_number u zero_level tide_system heights",
        "differences": "from to geopotential_difference u height_difference u_height_difference",
        "effects": "effect y potential height_mm",
        "comparison": "from to clock geodetic difference u normalised_error",
    }.items():
        assert told[table], table
        for row in told[table]:
            assert set(names.split()) <= set(row), table
    assert set(told["sites"][1]["heights"]) == {"normal", "orthometric", "dynamic"}
    assert set(told["sites"][1]["heights"]["normal"]) == {"value", "u"}
    assert {"chi_squared", "degrees_of_freedom", "p_value"} <= set(told["fit"])
    assert told["covariance"]["order"] == ["harbel", "kesselin"]


def test_the_json_on_the_screen_is_the_file(levelled):
    out, told = levelled
    assert json.loads((out / "result.json").read_text(encoding="utf-8")) == told


def test_the_netcdf_holds_the_same_numbers(levelled):
    out, told = levelled
    with netCDF4.Dataset(out / "result.nc") as stored:
        numbers = stored["geopotential_number"]
        assert list(numbers[:]) == [site["geopotential_number"] for site in told["sites"]]
        assert (numbers.units, numbers.tide_system) == ("m2 s-2", "zero_tide")
        assert stored["covariance"][:].tolist() == told["covariance"]["matrix"]


def test_the_budget_adds_up(levelled):
    told = levelled[1]
    squares = sum(line["potential"] ** 2 for line in told["effects"])
    assert squares == pytest.approx(told["differences"][0]["u"] ** 2, rel=1e-9)


def test_inputs_stand_with_their_checksums(levelled, project):
    inputs = {one["path"]: one["sha256"] for one in levelled[1]["provenance"]["inputs"]}
    document = (project / "examples" / "saddle" / "campaign.toml").read_bytes()
    assert inputs["campaign.toml"] == hashlib.sha256(document).hexdigest()
    assert len(inputs) == 1 + 7 + 1  # document, records, grid


def test_equal_input_gives_equal_bytes(levelled, project, tmp_path):
    again = run(project / "examples" / "saddle" / "campaign.toml", "--out", tmp_path, "--quiet")
    assert (again.exit_code, again.stdout) == (0, "")
    for name in ("result.json", "result.nc", "correlations.csv", "report.html"):
        assert (tmp_path / name).read_bytes() == (levelled[0] / name).read_bytes(), name


def test_the_screen_tells_the_answer_first(project, tmp_path):
    told = run(project / "examples" / "saddle" / "campaign.toml", "--out", tmp_path, "-v").stdout
    assert told.index("Differences") < told.index("Sessions") < told.index("Budget")
    assert "national height system" in told


def test_a_session_may_be_left_out_and_that_is_said(saddle, tmp_path):
    result = run(saddle, "--out", tmp_path / "out", "--without", "saddle 2", "--json")
    told = json.loads(result.stdout)
    assert "saddle 2" not in [session["id"] for session in told["sessions"]]
    assert "session saddle 2 was left out on request" in told["notes"]


def test_results_are_not_replaced_unasked(saddle, tmp_path):
    out = tmp_path / "out"
    assert run(saddle, "--out", out).exit_code == 0
    before = (out / "result.json").stat().st_mtime_ns
    refused = run(saddle, "--out", out)
    assert refused.exit_code == 1
    assert (
        "results exist already: result.json, result.nc, correlations.csv, report.html"
        in refused.stderr
    )
    assert (out / "result.json").stat().st_mtime_ns == before
    assert run(saddle, "--out", out, "--force").exit_code == 0


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ("records/local-1.txt.gz", "records/lost.txt", r"file does not exist: records/lost.txt"),
        ("records/local-1.txt.gz", "records/empty.txt", "the file is empty"),
        ("records/local-1.txt.gz", "records/binary.txt", "the file is binary, not text"),
        (
            'local-1.txt.gz", value',
            'local-1.txt.gz", value_column = 3, value',
            "there is no such column: 3 (at records/local-1.txt.gz)",
        ),
        ('"171Yb"', '"27Al+"', "Check the nominal ratio: is it the right pair"),
        ('"87Sr"', '"88Sr"', "y is typically -1.45e-07, which no height difference on Earth"),
        ('saddle-1.txt.gz", value = "ratio"', 'saddle-1.txt.gz"', "value_column, and whether"),
        ("2027-05-03T07", "2028-05-03T07", "its record starts at 2027-05-03T07:00:00Z, outside"),
        ("2027-05-03T07", "2026-05-03T07", "its record stops at 2027-05-03T16:59:57Z, outside"),
        ('{ clock = "wanderer", site = "kesselin" }', '{ clock = "wanderer", site = "kes" }', "no"),
        ("2027-05-06T06", "2027-05-04T08", "clock 'wanderer' is at 'kesselin' while session"),
        ("u = 1.8e-18", "u = -1.8e-18", "must be greater than or equal to 0 (found -1.8e-18)"),
        ('tide_system = "zero_tide"', 'tide_system = "low_tide"', "must be 'mean_tide'"),
        ('ellipsoidal_tide_system = "tide_free"', "", "with a [geoid] it must be stated"),
        ("longitude = 11.95", "longitude = 31.95", "a point lies outside the grid"),
        ('zero_level = "height_reference"', 'zero_level = "sea"', "sea"),
    ],
)
def test_bad_input_is_refused_with_what_where_and_what_next(saddle, tmp_path, old, new, told):
    (saddle.parent / "records" / "empty.txt").touch()
    (saddle.parent / "records" / "binary.txt").write_bytes(bytes(range(256)) * 8)
    text = saddle.read_text(encoding="utf-8")
    assert old in text
    saddle.write_text(text.replace(old, new, 1), encoding="utf-8")
    result = run(saddle, "--out", tmp_path / "out")
    assert result.exit_code == 1
    assert told in result.stderr
    assert result.stdout == ""
    assert not any((tmp_path / "out").glob("*"))


def test_a_session_that_is_not_there_cannot_be_left_out(saddle, tmp_path):
    result = run(saddle, "--out", tmp_path / "out", "--without", "local 9")
    assert result.exit_code == 1
    assert "no such session to leave out: local 9. Sessions: local 1, local 2" in result.stderr


def test_sites_that_no_session_ties_are_named(saddle, tmp_path):
    words = ["--without", "saddle 1", "--without", "saddle 2", "--without", "saddle 3"]
    result = run(saddle, "--out", tmp_path / "out", *words, "--json")
    # What remains says nothing of the saddle, so it must not appear with a number.
    assert [site["id"] for site in json.loads(result.stdout)["sites"]] == ["harbel"]


def test_a_campaign_without_calibration_says_what_is_missing(saddle, tmp_path):
    words = [word for n in range(1, 5) for word in ("--without", f"local {n}")]
    result = run(saddle, "--out", tmp_path / "out", *words)
    assert result.exit_code == 1
    assert "87Sr" in result.stderr
    assert "171Yb" in result.stderr


def test_a_folder_that_may_not_be_written_is_refused_before_computing(saddle, tmp_path):
    (tmp_path / "file").write_text("not a folder")
    result = run(saddle, "--out", tmp_path / "file" / "out")
    assert result.exit_code == 1
    assert "cannot write to the output folder" in result.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="the limit on file sizes is a POSIX one")
@pytest.mark.parametrize("kilobytes", [8, 40, 100])
def test_a_disk_that_fills_up_leaves_no_half_file(saddle, tmp_path, kilobytes):
    out = tmp_path / "out"
    words = [sys.executable, "-m", "clockgeo", "level", str(saddle), "--out", str(out)]
    shell = ["sh", "-c", f'ulimit -f {2 * kilobytes}; exec "$@"', "sh", *words]
    done = subprocess.run(shell, capture_output=True, text=True, check=False)
    assert done.returncode == 1
    assert "cannot write the output (File too large)" in done.stderr
    whole = {"result.json", "result.nc", "correlations.csv", "report.html"}
    assert {path.name for path in out.iterdir()} < whole


def test_wrong_usage_has_its_own_exit_code(saddle):
    assert run(saddle).exit_code == 2
    assert run(saddle, "--out", "x", "--frobnicate").exit_code == 2


def test_a_site_that_no_session_reaches_is_told(saddle, tmp_path):
    words = [word for name in ("saddle 1", "saddle 2", "saddle 3") for word in ("--without", name)]
    result = run(saddle, *words, "--out", tmp_path / "out")
    assert result.exit_code == 0, result.stderr
    assert "no session reaches kesselin" in result.stdout.replace("\n", " ")


def test_a_geoid_in_another_tide_system_is_converted_and_told(saddle, tmp_path):
    text = saddle.read_text(encoding="utf-8")
    assert 'tide_system = "zero_tide"' in text
    other = text.replace('tide_system = "zero_tide"', 'tide_system = "mean_tide"', 1)
    saddle.write_text(other, encoding="utf-8")
    told = json.loads(run(saddle, "--out", tmp_path / "out", "--json").stdout)
    (line,) = told["comparison"]
    assert line["source"].endswith("converted from zero_tide to mean_tide")
