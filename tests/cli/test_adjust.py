"""The command adjust on the shipped example: truth, files, words; and what it refuses."""

from __future__ import annotations

import csv
import io
import json
import shutil

import netCDF4
import pytest
from typer.testing import CliRunner

from clockgeo.campaign import AdjustResult, read_result
from clockgeo.cli import app
from clockgeo.network.epsg1046 import read_wkt

TRUE_OFFSETS = {"coast": 0.183, "inland": -0.312, "highland": 0.417, "island": -0.548}
BLUNDER = "lines: coast-019 to coast-073"


def run(*words):
    return CliRunner().invoke(app, ["adjust", *map(str, words)])


@pytest.fixture(scope="module")
def adjusted(project, tmp_path_factory):
    out = tmp_path_factory.mktemp("adjusted")
    result = run(project / "examples" / "four-datums" / "campaign.toml", "--out", out, "--json")
    assert result.exit_code == 0, result.stderr
    return out, json.loads(result.stdout)


def test_offsets_and_tilts_hold_the_truth_they_were_drawn_from(adjusted):
    datums = {datum["id"]: datum for datum in adjusted[1]["datums"]}
    for name, truth in TRUE_OFFSETS.items():
        # One drawing: within 2.6 u, which is left once in a hundred.
        assert abs(datums[name]["offset"] - truth) < 2.6 * datums[name]["u"], name
        assert 0.005 < datums[name]["u"] < 0.05
    inland = datums["inland"]
    assert abs(inland["tilt_north"] - 2.55e-7) < 2.6 * inland["u_tilt_north"]
    assert abs(inland["tilt_east"] + 0.9e-7) < 2.6 * inland["u_tilt_east"]
    assert inland["u_tilt_north"] < 1e-7


def test_the_blunder_is_found_with_its_size(adjusted):
    suspects = {one["id"]: one for one in adjusted[1]["blunders"]["suspects"]}
    assert suspects[BLUNDER]["standardised"] > 10.0
    # 83 mm at 9.8 m s-2 are 0.81 m2 s-2.
    assert abs(suspects[BLUNDER]["bias"] - 0.083 * 9.808) < 3 * suspects[BLUNDER]["u"]
    assert adjusted[1]["global_test"]["passed"] is False
    # One test in a thousand errs: of a thousand observations one or two more may be named.
    assert len(suspects) <= 4


def test_without_the_blunder_everything_fits(project, tmp_path):
    path = project / "examples" / "four-datums" / "campaign.toml"
    result = run(path, "--out", tmp_path / "out", "--without", BLUNDER, "--json")
    told = json.loads(result.stdout)
    assert told["global_test"]["passed"] is True
    assert f"observation {BLUNDER} was left out on request" in told["notes"]


def test_the_names_that_stay(adjusted):
    told = adjusted[1]
    assert told["schema"] == "clockgeo/adjust/1"
    assert {"id", "offset", "u", "tilt_north", "tilt_east", "u_tilt_north", "u_tilt_east"} <= set(
        told["datums"][0]
    )
    assert {
        "id",
        "kind",
        "residual",
        "standardised",
        "redundancy",
        "minimal_detectable_bias",
    } <= set(told["observations"][0])
    assert {"variance_factor", "global_test", "variance_components"} <= set(told)
    assert {"sessions", "sites", "differences", "covariance", "effects", "fit"} <= set(told)
    assert {row["kind"] for row in told["observations"]} == {
        "known",
        "clock",
        "levelled",
        "published",
        "gnss",
    }


def test_the_island_hangs_on_clocks_and_gnss_alone(adjusted):
    pair = adjusted[1]["pairs"][1]
    assert (pair["from"], pair["to"]) == ("coast-001", "island-001")
    # No line reaches the island: a levelled tie would give millimetres.
    assert 0.1 < pair["u"] < 0.5


def test_files_hold_the_same_numbers(adjusted):
    out, told = adjusted
    result = read_result(out)
    assert isinstance(result, AdjustResult)
    assert json.loads(result.model_dump_json(by_alias=True)) == told
    rows = list(csv.DictReader(io.StringIO((out / "points.csv").read_text(encoding="utf-8"))))
    points = json.loads((out / "points.geojson").read_text(encoding="utf-8"))["features"]
    assert len(rows) == len(points) == len(told["points"]) == 400
    for row, feature, point in zip(rows, points, told["points"], strict=True):
        number = point["geopotential_number"]
        assert float(row["geopotential_number (m2 s-2)"]) == number
        assert feature["properties"]["geopotential_number_m2_s2"] == number
        assert feature["geometry"]["coordinates"] == [point["longitude"], point["latitude"]]
    with netCDF4.Dataset(out / "result.nc") as stored:
        offsets = stored["datum_offset"][:].tolist()
        assert offsets == [datum["offset"] for datum in told["datums"]]
        assert stored["point_geopotential_number"].units == "m2 s-2"


def test_the_hand_over_reads_back_to_a_tenth_of_a_millimetre(adjusted):
    out, told = adjusted
    for datum in told["datums"]:
        operation = read_wkt((out / f"datum-{datum['id']}.wkt").read_text(encoding="utf-8"))
        origin = datum["origin_latitude"], datum["origin_longitude"]
        assert operation.shift(*origin) == pytest.approx(datum["offset"], abs=1e-4)
        assert datum["epsg_1046"]["largest_departure"] < 1e-3


def test_the_screen_is_readable(project, tmp_path):
    path = project / "examples" / "four-datums" / "campaign.toml"
    told = run(path, "--out", tmp_path / "out").stdout
    assert "old inland network" in told
    assert "global test failed" in told
    assert BLUNDER in told
    assert "national height system" in told


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ('file = "lines.csv"', 'file = "lost.csv"', "a table of the document is not there"),
        ('points = "points.csv"', "", "is not a point of the net"),
        ('class = "second_I"', "", "the line has no u"),
        (
            'id = "lines"\nname = "lines of coast, highland and island"\ntide_system = "zero_tide"',
            'id = "lines"\ntide_system = "tide_free"',
            "tide systems do not agree: [[levelling]] lines is tide_free",
        ),
        ('file = "island.csv"', "", "the table has no point"),
        ('file = "island.csv"', 'file = "highland.csv"', "points stand in two datums under one id"),
        ('[geoid]\ngrid = "quasigeoid.nc"', "", "GNSS heights need a geoid model"),
        ('kind = "normal"', 'kind = "nominal"', "kind: must be 'normal'"),
    ],
)
def test_bad_tables_are_refused(project, tmp_path, old, new, told):
    folder = shutil.copytree(project / "examples" / "four-datums", tmp_path / "example")
    text = (folder / "campaign.toml").read_text(encoding="utf-8")
    assert old in text
    (folder / "campaign.toml").write_text(text.replace(old, new, 1), encoding="utf-8")
    result = run(folder / "campaign.toml", "--out", tmp_path / "out")
    assert result.exit_code == 1
    assert told in result.stderr
    assert not any((tmp_path / "out").glob("*"))


@pytest.mark.parametrize(
    ("line", "told"),
    [
        ("coast-001,coast-001,1.0,1000", "the line leads to its own start"),
        ("coast-001,nowhere,1.0,1000", "to is not a point of the net"),
        ("coast-001,coast-002,,1000", "neither height_difference nor geopotential_difference"),
        ("coast-001,coast-002,one,1000", "height_difference"),
    ],
)
def test_bad_lines_are_named(project, tmp_path, line, told):
    folder = shutil.copytree(project / "examples" / "four-datums", tmp_path / "example")
    with (folder / "lines.csv").open("a", encoding="utf-8") as stream:
        stream.write(f"{line}\n")
    result = run(folder / "campaign.toml", "--out", tmp_path / "out")
    assert result.exit_code == 1
    assert told in result.stderr
    assert "lines.csv" in result.stderr


def test_a_copied_line_is_refused(project, tmp_path):
    folder = shutil.copytree(project / "examples" / "four-datums", tmp_path / "example")
    text = (folder / "lines.csv").read_text(encoding="utf-8")
    (folder / "lines.csv").write_text(text + text.splitlines()[5] + "\n", encoding="utf-8")
    result = run(folder / "campaign.toml", "--out", tmp_path / "out")
    assert result.exit_code == 1
    assert "the line with the same value is there before" in result.stderr


def test_an_observation_to_leave_out_must_be_there(project, tmp_path):
    path = project / "examples" / "four-datums" / "campaign.toml"
    result = run(path, "--out", tmp_path / "out", "--without", "no such line")
    assert result.exit_code == 1
    assert "an observation to be left out is not there: no such line" in result.stderr
