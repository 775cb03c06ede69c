"""`clockgeo geoid`: sample, describe, convert, and what it refuses."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app
from clockgeo.gravity import open_geoid
from grid_files import CONVENTIONS, small_grid, write_cf, write_gtx, write_isg

FLAGS = [
    part for name, text in CONVENTIONS.items() for part in ("--" + name.replace("_", "-"), text)
]


def run(*arguments):
    return CliRunner().invoke(app, ["geoid", *map(str, arguments)])


def result_of(*arguments):
    done = run(*arguments, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


@pytest.fixture
def grid(tmp_path):
    def edit(dataset):
        dataset.zeta.attrs["u"] = 0.02
        return dataset

    return write_cf(tmp_path / "land.nc", small_grid(), edit=edit)


@pytest.fixture
def points(tmp_path):
    path = tmp_path / "points.csv"
    path.write_text("# invented\nname, latitude, longitude\na, 46.25, 10.5\nb, 47.0, 11.0\n")
    return path


def test_one_point(grid):
    result = result_of(grid, "--latitude", 46.25, "--longitude", 10.5)
    assert result["schema"] == "clockgeo/geoid/1"
    assert result["values"] == pytest.approx([40.7])  # 40 + 0.25/0.5 + 0.1 * 0.5/0.25
    assert result["u"] == [0.02]
    assert result["quantity"] == "height_anomaly"
    assert result["tide_system"] == "zero_tide"
    assert result["interpolation"] == "bilinear"
    assert result["conventions"]["zero_level"] == "height_reference"


def test_points_of_a_file_and_a_table_of_values(grid, points, tmp_path):
    out = tmp_path / "values.csv"
    result = result_of(grid, "--points", points, "--out", out, "--interpolation", "bicubic")
    assert result["values"] == pytest.approx([40.7, 42.4])
    assert result["interpolation"] == "bicubic"
    with out.open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [float(row["height_anomaly"]) for row in rows] == pytest.approx([40.7, 42.4])
    assert float(rows[1]["u"]) == 0.02
    assert run(grid, "--points", points, "--out", out).exit_code == 1
    assert run(grid, "--points", points, "--out", out, "--force", "--quiet").stdout == ""


def test_points_outside_are_an_error_or_null(grid):
    place = ["--latitude", 40, "--longitude", 10.5]
    done = run(grid, *place)
    assert done.exit_code == 1
    assert "lies outside the grid" in done.stderr
    assert "land.nc" in done.stderr
    result = result_of(grid, *place, "--outside", "nan")
    assert result["values"] == [None]


def test_the_table_for_people(grid):
    said = run(grid, "--latitude", 46.25, "--longitude", 10.5).stdout
    for words in ("40.7000", "0.0200", "height anomaly above grs80, zero_tide", "zero level"):
        assert words in said
    assert "not an official height" in said


def test_a_grid_that_comes_with_clockgeo_is_found_by_name():
    value = result_of("egm96_15.nc", "--latitude", 0.0, "--longitude", 0.0)["values"][0]
    # published test value of the EGM96 geoid near 0 N, 0 E: 17.16 m (from memory)
    assert value == pytest.approx(17.16, abs=0.01)


def test_describe_needs_no_conventions(tmp_path):
    path = write_gtx(tmp_path / "land.gtx", small_grid())
    said = run(path, "--describe").stdout
    assert "land.gtx, GTX" in said
    assert "not stated; give --tide-system: one of mean_tide, zero_tide, tide_free" in said
    result = result_of(path, "--describe")
    assert list(result["not_stated"]) == list(CONVENTIONS)
    assert result["grids"][0]["north"] == pytest.approx(47.5)
    assert run(path, "--describe", "--quiet").stdout == ""


def test_describe_tells_what_is_stated(tmp_path):
    said = run(write_isg(tmp_path / "land.isg", small_grid()), "--describe").stdout
    assert "tide system          zero_tide" in said
    assert "give --zero-level" in said


@pytest.mark.parametrize("ending", ["nc", "ggxf"])
def test_convert_keeps_what_is_stated(ending, tmp_path):
    path, out = write_gtx(tmp_path / "land.gtx", small_grid()), tmp_path / f"land.{ending}"
    done = run(path, "--convert", out, *FLAGS, "--u", 0.05, "--source", "an invented land")
    assert done.exit_code == 0, done.output
    assert "written" in done.stdout
    model = open_geoid(out)
    assert model.conventions == open_geoid(path, u=0.05, **CONVENTIONS).conventions
    assert model.source == "an invented land"
    assert run(path, "--convert", out, *FLAGS).exit_code == 1


def test_convert_may_pack(tmp_path, grid):
    out = tmp_path / "packed.nc"
    assert run(grid, "--convert", out, "--resolution", 0.01, "--quiet").stdout == ""
    values = open_geoid(out).tiles[0].values
    assert np.allclose(values, np.round(values, 2), atol=1e-12)


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        ([], 2, "give a point, --points, --describe or --convert"),
        (["--latitude", 47], 2, "give --latitude and --longitude, or --points"),
        (["--latitude", 47, "--longitude", 11, "--outside", "zero"], 2, "takes error or nan"),
        (["--latitude", 95, "--longitude", 11], 1, "latitude out of range: 95"),
        (["--latitude", 47, "--longitude", 400], 1, "longitude out of range: 400"),
        (["--latitude", 47, "--longitude", 11, "--interpolation", "magic"], 1, "'magic'"),
        (["--latitude", 47, "--longitude", 11, "--tide-system", "tide_free"], 1, "contradicts"),
        (["--latitude", 47, "--longitude", 11, "--epoch", 2025], 1, "no other epoch"),
        (["--convert", "land.tif"], 1, "has this ending: land.tif"),
    ],
)
def test_bad_input(arguments, code, message, grid):
    done = run(grid, *arguments)
    assert done.exit_code == code, done.output
    # a usage message is wrapped and framed by the terminal layer
    assert message in " ".join(done.stderr.replace("│", " ").split())


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("latitude,height\n1,2\n", "column is missing in the file of points: longitude"),
        ("latitude,longitude\n1,x\n", "longitude is no number in 1 of 1 rows: row 1 holds 'x'"),
        ("latitude,longitude\n1,\n2,3\n", "longitude is no number in 1 of 2 rows: row 1"),
        ("", "file of points cannot be read"),
    ],
)
def test_bad_files_of_points(text, message, grid, tmp_path):
    path = tmp_path / "p.csv"
    path.write_text(text)
    done = run(grid, "--points", path)
    assert done.exit_code == 1
    assert message in done.stderr
    assert "p.csv" in done.stderr


def test_grids_that_are_none(tmp_path):
    notes = tmp_path / "notes.nc"
    notes.write_text("just words, no grid\n" * 10)
    done = run(notes, "--describe")
    assert done.exit_code == 1
    assert "not a grid of a known format" in done.stderr
    assert "grid file is not there" in run("nowhere.nc", "--describe").stderr


def test_the_example_of_the_help_runs():
    text = run("--help").stdout
    example = text.split("Example: clockgeo geoid ")[1].split("\n")[0]
    assert run(*example.split()).exit_code == 0
