"""Pictures that commands draw when asked."""

from __future__ import annotations

import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app

TIDE = ["tide", "--latitude", "52.3", "--longitude", "10.5", "--start", "2027-03-01"]
TIDE += ["--stop", "2027-03-02"]
GEOID = ["geoid", "saddle_quasigeoid.nc"]
STARTS = {".png": b"\x89PNG", ".svg": b"<?xml", ".pdf": b"%PDF-"}


def run(*arguments):
    return CliRunner().invoke(app, [str(argument) for argument in arguments])


def drawn(path, *arguments):
    done = run(*arguments, "--picture", path, "--quiet")
    assert done.exit_code == 0, done.output
    return path.read_bytes()


@pytest.fixture
def record(tmp_path):
    mjd = 61528.0 + np.arange(400) / 86400.0
    y = 1e-16 * np.sin(np.arange(400.0) ** 2)
    y[200] = 1e-13
    path = tmp_path / "record.txt"
    np.savetxt(path, np.stack([mjd, y], axis=1), fmt=["%.6f", "%.6e"])
    return path


@pytest.mark.parametrize("suffix", STARTS)
def test_kinds_of_pictures(tmp_path, suffix):
    assert drawn(tmp_path / f"tide{suffix}", *TIDE).startswith(STARTS[suffix])


def test_tide_of_two_places(tmp_path):
    two = [*TIDE, "--to-latitude", "36", "--to-longitude", "140"]
    assert "140.0000° minus 52.3000°" in drawn(tmp_path / "tide.svg", *two).decode()


def test_map_around_a_point(tmp_path):
    picture = drawn(tmp_path / "map.svg", *GEOID, "--latitude", "47.2", "--longitude", "11.1")
    assert "height anomaly of saddle_quasigeoid.nc / m" in picture.decode()
    assert "47.2000°, 11.1000°" in picture.decode()


def test_map_of_points_outside_the_grid(tmp_path):
    points = tmp_path / "points.csv"
    points.write_text("latitude,longitude\n47.2,11.1\n60.0,11.1\n", encoding="utf-8")
    arguments = [*GEOID, "--points", points, "--outside", "nan"]
    assert "no value" in drawn(tmp_path / "map.svg", *arguments).decode()


def test_a_map_needs_points(tmp_path):
    done = run(*GEOID, "--describe", "--picture", tmp_path / "map.svg")
    assert done.exit_code == 2
    assert "around points" in done.output


def test_a_record_with_its_flags(tmp_path, record):
    picture = drawn(tmp_path / "record.svg", "screen", record).decode()
    assert "outlier (1)" in picture
    assert "record.txt" in picture


def test_several_records_get_numbers(tmp_path, record):
    done = run("screen", record, record, "--picture", tmp_path / "a.png", "--quiet")
    assert done.exit_code == 0, done.output
    assert sorted(path.name for path in tmp_path.glob("*.png")) == ["a-1.png", "a-2.png"]


@pytest.mark.parametrize(
    "arguments",
    [TIDE, [*GEOID, "--latitude", "47.2", "--longitude", "11.1"]],
    ids=["tide", "geoid"],
)
def test_what_cannot_be_written_is_refused_first(tmp_path, arguments):
    (tmp_path / "there.png").write_bytes(b"mine")
    for name, words in (
        ("a.gif", "no such kind of picture: 'a.gif'. One of .png, .svg, .pdf"),
        ("there.png", "the picture exists already"),
        ("none/a.png", "the folder of the picture is not there"),
    ):
        done = run(*arguments, "--picture", tmp_path / name)
        assert done.exit_code == 1
        assert words in done.output
    assert (tmp_path / "there.png").read_bytes() == b"mine"


@pytest.fixture(scope="module")
def campaign(project, tmp_path_factory):
    """The shipped example with records drawn anew."""
    folder = tmp_path_factory.mktemp("campaign")
    path = folder / "campaign.toml"
    path.write_bytes((project / "examples" / "saddle" / "campaign.toml").read_bytes())
    assert run("simulate", path, "--seed", 3, "--quiet").exit_code == 0
    return path


def test_pictures_of_a_campaign(campaign, tmp_path):
    figures = tmp_path / "figures"
    options = ["--figures", figures, "--figure-kind", "svg"]
    done = run("level", campaign, "--out", tmp_path / "out", *options)
    assert done.exit_code == 0, done.output
    names = {path.name for path in figures.iterdir()}
    assert {"map.svg", "timeline.svg", "record-1.svg", "budget-1.svg", "comparison.svg"} <= names
    assert "figures/map.svg" in done.output.replace("\n", "")


def test_an_unknown_kind_is_refused_before_levelling(campaign, tmp_path):
    options = ["--figures", tmp_path, "--figure-kind", "gif"]
    done = run("level", campaign, "--out", tmp_path / "out", *options)
    assert done.exit_code == 1
    assert "no such kind of picture" in done.output
    assert not list((tmp_path / "out").iterdir())
