"""Lattices that go around the Earth: seams, poles, registration; and those that do not."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.gravity.grid_content import tile_of
from clockgeo.gravity.interpolation import METHODS

SMOOTH = {"bilinear": 1.2e-2, "biquadratic": 4e-4, "bicubic": 4e-4}
"""Largest error in m of a field of 10 m over a lattice of 2 degrees: curvature 10 m / rad² times
step²/8 in each direction, 3e-3 m, four times that where meridians converge; the smooth methods are
an order better (common practice, no source)."""


def around(latitude, longitude):
    """A smooth field on the sphere that is not symmetric about the poles."""
    phi, lam = np.radians(latitude), np.radians(longitude)
    x, y, z = np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)
    return 10.0 * (0.6 * x + 0.3 * y * z - 0.5 * z + 0.2 * x * y)


def global_tile(latitudes, longitudes):
    phi, lam = np.meshgrid(latitudes, longitudes, indexing="ij")
    return tile_of(latitudes, longitudes, around(phi, lam), where="invented")


LATTICES = {
    "nodes on the poles, 0..358": (np.arange(-90.0, 91.0, 2.0), np.arange(0.0, 360.0, 2.0)),
    "nodes on the poles, 0..360": (np.arange(-90.0, 91.0, 2.0), np.arange(0.0, 361.0, 2.0)),
    "nodes, -180..180, descending": (np.arange(90.0, -91.0, -2.0), np.arange(-180.0, 181.0, 2.0)),
    "cells, 1..359": (np.arange(-89.0, 90.0, 2.0), np.arange(1.0, 360.0, 2.0)),
    "cells, -179..179, descending": (np.arange(89.0, -90.0, -2.0), np.arange(-179.0, 180.0, 2.0)),
}


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("name", LATTICES)
def test_a_closed_lattice_holds_everywhere(name, method, rng):
    tile = global_tile(*LATTICES[name])
    assert tile.closes
    latitude = np.concatenate([np.degrees(np.arcsin(rng.uniform(-1, 1, 4000))), [90.0, -90.0] * 50])
    longitude = np.concatenate([rng.uniform(-180.0, 360.0, 4000), rng.uniform(-180, 360, 100)])
    values, inside = tile.sample("values", latitude, longitude, method)
    assert inside.all()
    assert np.max(np.abs(values - around(latitude, longitude))) < SMOOTH[method]


@pytest.mark.parametrize("name", LATTICES)
@given(latitude=st.floats(-90.0, 90.0), longitude=st.floats(-180.0, 0.0))
def test_a_turn_changes_nothing(name, latitude, longitude):
    tile = global_tile(*LATTICES[name])
    first, second = (
        tile.sample("values", np.array([latitude]), np.array([lam]), "bicubic")[0][0]
        for lam in (longitude, longitude + 360.0)
    )
    assert first == pytest.approx(second, abs=1e-9)


def test_a_region_ends_at_its_last_nodes():
    tile = tile_of([10.0, 11.0, 12.0], [170.0, 175.0, -180.0, -175.0], np.ones((3, 4)), where="x")
    assert (tile.west, tile.width, tile.closes) == (170.0, 15.0, False)
    latitude = np.array([10.0, 12.0, 12.001, 9.999, 11.0, 11.0, 11.0, 11.0])
    longitude = np.array([170.0, 185.0, 180.0, 180.0, 169.999, -174.999, -175.0, 0.0])
    _, inside = tile.sample("values", latitude, longitude, "bilinear")
    assert inside.tolist() == [True, True, False, False, False, False, True, False]


def test_a_lattice_that_stops_short_of_the_pole_does_not_reach_it():
    latitudes = np.arange(-80.0, 81.0, 2.0)
    tile = global_tile(latitudes, np.arange(0.0, 360.0, 2.0))
    _, inside = tile.sample("values", np.array([80.0, 80.1]), np.array([5.0, 5.0]), "bilinear")
    assert inside.tolist() == [True, False]


def test_single_precision_axes_are_read_as_meant():
    latitude = np.float32(46.0 + np.arange(81) / 40.0)
    longitude = np.float32(350.0 + np.arange(121) / 60.0)
    tile = tile_of(latitude, longitude, np.ones((81, 121)), where="x")
    assert tile.latitude_step == 1.0 / 40.0
    assert tile.longitude_step == 1.0 / 60.0
    assert (tile.south, tile.west) == (46.0, -10.0)


def refused(latitude, longitude, values=None):
    shape = (len(latitude), len(longitude))
    return tile_of(latitude, longitude, np.ones(shape) if values is None else values, where="a.nc")


@pytest.mark.parametrize(
    ("axes", "message"),
    [
        (([40.0, 41.0, 43.0], [0.0, 1.0]), r"latitudes are not evenly spaced: steps from 1 to 2"),
        (([40.0, 41.0], [0.0, 1.0, 5.0]), r"longitudes are not evenly spaced"),
        (([40.0, np.nan], [0.0, 1.0]), r"latitudes are not finite"),
        (([40.0, 40.0], [0.0, 1.0]), r"latitudes are not evenly spaced"),
        (
            (np.arange(0.0, 360.0, 90.0), [0.0, 1.0]),
            r"latitudes are out of range.*axes are swapped",
        ),
        (([40.0, 41.0], np.arange(0.0, 800.0, 100.0)), r"longitudes are out of range: 0 to 700"),
        (([40.0], [0.0, 1.0]), r"do not fit its axes: shape \(1, 2\)"),
    ],
)
def test_axes_that_are_none(axes, message):
    with pytest.raises(DataError, match=message):
        refused(*axes)


def test_values_that_are_none():
    axes = [40.0, 41.0], [0.0, 1.0]
    with pytest.raises(DataError, match=r"shape \(2, 3\) for 2 latitudes and 2 longitudes"):
        refused(*axes, values=np.ones((2, 3)))
    with pytest.raises(DataError, match=r"too large for geoid heights in metres: 4800 .*a\.nc"):
        refused(*axes, values=np.full((2, 2), 4800.0))
    with pytest.raises(DataError, match=r"holds no value at all"):
        refused(*axes, values=np.full((2, 2), np.nan))
    closed = np.ones((2, 5))
    closed[1, 4] = 2.0
    with pytest.raises(DataError, match=r"one meridian but differ: by 1 m"):
        refused([40.0, 41.0], np.arange(0.0, 361.0, 90.0), closed)
