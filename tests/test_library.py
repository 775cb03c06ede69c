"""The face of the library: every name is there, lazily, and the tutorial runs as written."""

from __future__ import annotations

import subprocess
import sys

import pytest

import clockgeo


@pytest.mark.parametrize("name", clockgeo.__all__)
def test_every_public_name_is_there(name):
    assert getattr(clockgeo, name) is not None
    assert name in dir(clockgeo)


def test_an_unknown_name_is_refused():
    with pytest.raises(AttributeError, match="has no attribute 'levels'"):
        clockgeo.levels  # noqa: B018


def test_importing_costs_next_to_nothing():
    """No heavy package comes along until a name is used."""
    heavy = ("numpy", "polars", "xarray")
    code = f"import sys, clockgeo; print([name for name in {heavy} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_the_tutorial_runs(project, tmp_path):
    words = [
        sys.executable,
        "-W",
        "error",
        str(project / "examples" / "tutorial.py"),
        str(tmp_path),
    ]
    done = subprocess.run(words, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert "harbel to kesselin: 13630." in done.stdout
    assert {path.name for path in tmp_path.iterdir()} == {
        "stability.png",
        "result.json",
        "result.nc",
        "correlations.csv",
        "report.html",
    }
