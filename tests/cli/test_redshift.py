"""The command redshift: the laboratory's report for the time scale."""

from __future__ import annotations

import json

import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app
from clockgeo.gravity import TideSystem, zero_level
from clockgeo.gravity.geoid_covariance import ErrorModel
from clockgeo.gravity.geoid_model import GeoidModel, GridTile

PLACE = ["--latitude", "52.3", "--longitude", "10.5", "--ellipsoidal-height", "130"]
ANOMALY = ["--height-anomaly", "43.5", "--u-separation", "0.02"]
CONVENTIONS = ["--tide-system", "mean_tide", "--zero-level", "height_reference"]


def run(*arguments):
    return CliRunner().invoke(app, ["redshift", *arguments])


def result_of(*arguments):
    done = run(*arguments, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def test_report_as_json():
    stated = ["--height-tide", "mean_tide", "--u-height", "0.01"]
    result = result_of(*PLACE, *ANOMALY, *CONVENTIONS, *stated)
    assert result["schema"] == "clockgeo/redshift/1"
    # U0 - U(86.5 m) at 52.3°: 9.8127377 - 3.086e-6/2 · 86.5, times 86.5; plus 2.600519
    expected = 86.5 * (9.812737 - 1.543e-6 * 86.5) + 2.600519
    assert result["geopotential_number"] == pytest.approx(expected, abs=1e-3)
    shift = result["geopotential_number"] / 299_792_458.0**2
    assert result["fractional_shift"] == pytest.approx(shift, rel=1e-12)
    assert result["zero_level"] == "time_scale"
    assert result["tide_system"] == "mean_tide"
    # 2.2 cm is 2.4e-18
    assert result["u"] == pytest.approx(2.44e-18, rel=0.01)
    difference = result["geopotential_number"] - result["geopotential_number_height_reference"]
    assert difference == pytest.approx(2.600519, abs=1e-6)


def test_the_atoms_stand_above_the_marker():
    low = result_of(*PLACE, *ANOMALY, *CONVENTIONS)
    high = result_of(*PLACE, *ANOMALY, *CONVENTIONS, "--rise", "1.0", "--gravity", "9.8125")
    assert high["geopotential_number"] - low["geopotential_number"] == pytest.approx(
        9.8125, abs=1e-5
    )


def test_a_tide_free_height_is_the_default_and_is_converted():
    default = result_of(*PLACE, *ANOMALY, *CONVENTIONS)
    mean = result_of(*PLACE, *ANOMALY, *CONVENTIONS, "--height-tide", "mean_tide")
    # h2 Wp with Wp(52.3°) = -0.84099
    assert default["geopotential_number"] - mean["geopotential_number"] == pytest.approx(
        0.6078 * -0.84099, abs=1e-4
    )


def test_a_grid_gives_the_separation_with_its_u(monkeypatch, tmp_path):
    """The grid's own conventions go in; what the user states is handed to the reader."""
    asked = {}

    def open_geoid(path, **stated):
        asked.update(stated, path=path)
        return GeoidModel(
            name=path.name,
            tiles=(GridTile(50.0, 8.0, 1.0, 1.0, np.full((6, 6), 43.5)),),
            quantity="height_anomaly",
            tide_system=TideSystem.MEAN_TIDE,
            zero_level=zero_level("height_reference"),
            ellipsoid="grs80",
            errors=ErrorModel(0.02),
        )

    monkeypatch.setattr("clockgeo.gravity.open_geoid", open_geoid, raising=False)
    grid = tmp_path / "invented.nc"
    result = result_of(*PLACE, "--grid", str(grid), "--zero-level", "height_reference")
    expected = result_of(*PLACE, *ANOMALY, *CONVENTIONS)
    assert result["fractional_shift"] == expected["fractional_shift"]
    assert result["u"] == pytest.approx(expected["u"], rel=1e-12)
    assert result["inputs"]["separation_source"] == "invented.nc"
    assert asked["path"] == grid
    assert asked["zero_level"] == "height_reference"


def test_the_table_for_people():
    done = run(*PLACE, *ANOMALY, *CONVENTIONS)
    assert "fractional shift" in done.stdout
    assert "permanent tide acts on the clock" in done.stdout
    assert run(*PLACE, *ANOMALY, *CONVENTIONS, "--quiet").stdout == ""


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        ([*PLACE, *ANOMALY], 2, "needs --u-separation, --tide-system and --zero-level"),
        ([*PLACE, *ANOMALY, "--geoid-height", "43"], 2, "give one of"),
        ([*PLACE[:-1], "29032", *ANOMALY, *CONVENTIONS], 1, "feet"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--latitude", "95"], 1, "latitude out of range: 95"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--longitude", "400"], 1, "longitude out of range: 400"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--height-anomaly", "4350"], 1, "height_anomaly out of"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--gravity", "981"], 1, "gravity out of range"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--zero-level", "sea"], 1, "unknown zero level: 'sea'"),
        ([*PLACE, *ANOMALY, *CONVENTIONS, "--rise", "1e5"], 1, "at most 2000 m"),
    ],
)
def test_bad_input(arguments, code, message):
    done = run(*arguments)
    assert done.exit_code == code
    assert message in " ".join(done.output.replace("│", " ").split())
