"""The command height: names, numbers, conversions, refusals."""

from __future__ import annotations

import json

import pytest
from typer.testing import CliRunner

from clockgeo.cli import app
from clockgeo.gravity import CAUTION


def run(*arguments):
    return CliRunner().invoke(app, ["height", *arguments])


def result_of(*arguments):
    done = run(*arguments, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def test_normal_height_as_json():
    result = result_of("--geopotential-number", "748", "--latitude", "52.3", "--kind", "normal")
    assert result["schema"] == "clockgeo/height/1"
    assert result["height"] == pytest.approx(76.228357, abs=1e-6)
    assert result["caution"] == CAUTION


@pytest.mark.parametrize(
    "kind", [["normal"], ["orthometric", "--gravity", "9.81"], ["dynamic"]], ids=lambda k: k[0]
)
def test_there_and_back(kind):
    place = ["--latitude", "46", "--kind", *kind]
    there = result_of("--geopotential-number", "19600", "--u", "0.2", *place)
    back = result_of("--height", str(there["height"]), "--u", str(there["u_height"]), *place)
    assert back["geopotential_number"] == pytest.approx(19_600, abs=1e-6)
    assert back["u_geopotential_number"] == pytest.approx(0.2)


def test_tide_system_and_zero_level_are_converted_when_asked():
    plain = result_of("--geopotential-number", "748", "--latitude", "52.3")
    assert plain["tide_system"] is None
    moved = result_of(
        *("--geopotential-number", "748", "--latitude", "52.3"),
        *("--from-tide", "zero_tide", "--to-tide", "mean_tide"),
        *("--from-zero-level", "height_reference", "--to-zero-level", "62636856.0005"),
    )
    # C_mean = C_zero - Wp with Wp(52.3°) = -0.84099, and 2.6005 between the two W0
    assert moved["geopotential_number"] == pytest.approx(748 + 0.84099 + 2.6005, abs=1e-4)
    assert moved["tide_system"] == "mean_tide"
    assert moved["height"] > plain["height"]


def test_a_height_changes_its_tide_system():
    moved = result_of(
        *("--height", "100", "--latitude", "60", "--from-tide", "mean_tide"),
        *("--to-tide", "zero_tide"),
    )
    # H_T at 60° is -122.394 mm (Wp over normal gravity), and 3e-5 of it for the height
    assert moved["height"] == pytest.approx(100 - 0.122394, abs=1e-5)


def test_a_datum_point_keeps_its_number():
    """EPSG method 1107, with the latitude of its nominal origin in place of the constant."""
    latitude = str(50 + 55 / 60 + 1.5 / 3600)
    moved = result_of(
        *("--height", "100.154", "--latitude", latitude, "--datum-latitude", "52.381389"),
        *("--from-tide", "zero_tide", "--to-tide", "mean_tide"),
    )
    # the registry's constant is the origin's term to 0.2 mm
    assert moved["height"] == pytest.approx(100.147, abs=0.0007)


def test_the_table_for_people():
    done = run("--geopotential-number", "748", "--latitude", "52.3")
    assert "76.228357" in done.stdout
    assert CAUTION in done.stdout
    assert run("--geopotential-number", "748", "--latitude", "52.3", "--quiet").stdout == ""


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["--latitude", "95", "--height", "10"], 1, "latitude out of range: 95"),
        (["--latitude", "52", "--height", "29032"], 1, "feet"),
        (["--latitude", "52", "--geopotential-number", "6.3e7"], 1, "geopotential number out of"),
        (["--latitude", "52", "--height", "10", "--kind", "geodetic"], 1, "unknown kind of height"),
        (["--latitude", "52", "--height", "10", "--kind", "orthometric"], 1, "need the gravity"),
        (
            ["--latitude", "52", "--height", "10", "--from-tide", "mean_tide", "--to-tide", "wet"],
            1,
            "unknown tide system: 'wet'",
        ),
        (["--latitude", "52"], 2, "either --geopotential-number or --height"),
        (["--latitude", "52", "--height", "1", "--geopotential-number", "1"], 2, "either"),
        (["--latitude", "52", "--height", "1", "--from-tide", "mean_tide"], 2, "give both"),
        (["--latitude", "52", "--height", "1", "--u", "-1"], 1, "must not be negative"),
        (["--height", "10"], 2, "latitude"),
    ],
)
def test_bad_input(arguments, code, message):
    done = run(*arguments)
    assert done.exit_code == code
    assert message in " ".join(done.output.replace("│", " ").split())
