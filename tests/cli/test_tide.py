"""The command tide: names, values, files, refusals."""

from __future__ import annotations

import json

import numpy as np
import pytest
import xarray
from typer.testing import CliRunner

from clockgeo.cli import app

HERE = ["--latitude", "52.3", "--longitude", "10.5"]
SPAN = ["--start", "2024-01-11T12:00:00Z", "--stop", "2024-01-12T12:00:00Z", "--step", "43200"]


def run(*arguments):
    return CliRunner().invoke(app, ["tide", *arguments])


def result_of(*arguments):
    done = run(*arguments, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def test_series_as_json():
    result = result_of(*HERE, *SPAN)
    assert result["epochs"] == [
        "2024-01-11T12:00:00.000Z",
        "2024-01-12T00:00:00.000Z",
        "2024-01-12T12:00:00.000Z",
    ]
    # the first two of the four recomputed epochs: -2.5010, 3.8533 before Love numbers
    generating = result["tide_generating_potential"]
    assert generating[:2] == pytest.approx([-2.5010, 3.8533], abs=5e-4)
    permanent = result["permanent_tide_generating_potential"]
    expected = 0.6941 * (np.array(generating) - permanent)
    # degrees 3 and 4 have factors of their own
    assert np.allclose(result["potential"], expected, rtol=0, atol=0.01)
    y = -np.array(result["potential"]) / 299_792_458.0**2
    assert np.allclose(result["fractional_frequency"], y, rtol=1e-12, atol=0)


def test_difference_is_second_minus_first():
    there = ["--latitude", "35.7", "--longitude", "139.6", "--ellipsoidal-height", "90"]
    second = [part.replace("--", "--to-") if part.startswith("--") else part for part in there]
    pair = result_of(*HERE, *second, *SPAN)
    one, two = result_of(*HERE, *SPAN), result_of(*there, *SPAN)
    difference = np.array(two["potential"]) - np.array(one["potential"])
    assert np.allclose(pair["potential"], difference, rtol=0, atol=1e-12)
    assert pair["minus"]["latitude"] == 52.3


@pytest.mark.parametrize("name", ["tide.csv", "tide.nc"])
def test_files(tmp_path, name):
    path = tmp_path / name
    done = run(*HERE, *SPAN, "--out", str(path))
    assert done.exit_code == 0
    assert f"written: {path}" in done.output.replace("\n", "")
    if path.suffix == ".nc":
        with xarray.open_dataset(path) as dataset:
            assert set(dataset.data_vars) == {"potential", "fractional_frequency", "tai"}
    again = run(*HERE, *SPAN, "--out", str(path))
    assert again.exit_code == 1
    assert "exists already" in again.output
    assert run(*HERE, *SPAN, "--out", str(path), "--force").exit_code == 0


def test_pole_and_loading_are_added(tmp_path):
    pole, load = tmp_path / "pole.csv", tmp_path / "load.csv"
    pole.write_text("epoch_utc,x_arcsec,y_arcsec\n2024-01-01,0.3,0.2\n2024-02-01,0.3,0.2\n")
    load.write_text(
        "constituent,doodson,offset_deg,height_amplitude_m,height_phase_deg,"
        "potential_amplitude_m2_s2,potential_phase_deg\nM2,255.555,0,0.01,0,0.02,0\n"
    )
    plain = np.array(result_of(*HERE, *SPAN)["potential"])
    for extra in (["--pole", str(pole)], ["--load", str(load)]):
        with_it = np.array(result_of(*HERE, *SPAN, *extra)["potential"])
        assert 1e-3 < np.max(np.abs(with_it - plain)) < 0.3


def test_the_table_for_people():
    done = run(*HERE, "--start", "2024-01-11", "--stop", "2024-01-13")
    assert "24 more epochs not shown" in done.stdout
    assert "permanent tide, not included: -0.5837" in done.stdout
    assert run(*HERE, *SPAN, "--quiet").stdout == ""


@pytest.mark.parametrize(
    ("changes", "code", "message"),
    [
        (["--latitude", "95"], 1, "latitude out of range: 95"),
        (["--longitude", "400"], 1, "longitude out of range: 400"),
        (["--ellipsoidal-height", "29032"], 1, "feet"),
        (["--start", "yesterday"], 1, "not a date and time: 'yesterday'"),
        (["--stop", "2024-01-01"], 1, "ends before it starts"),
        (["--step", "0"], 1, "the step must be positive"),
        (["--out", "tide.txt"], 1, "unknown kind of file"),
        (["--to-latitude", "10"], 2, "needs both"),
        (["--to-load", "x.csv"], 2, "needs a second place"),
        (["--pole", "absent.csv"], 1, "absent.csv"),
    ],
)
def test_bad_input(changes, code, message):
    done = run(*HERE, *SPAN, *changes)
    assert done.exit_code == code
    assert message in " ".join(done.output.replace("│", " ").split())
