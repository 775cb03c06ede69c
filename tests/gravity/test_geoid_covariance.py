"""Errors of geoid models between places: formulas, limits, positive definiteness, truth."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Geod

from checks import assert_close
from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import ErrorModel, covariance_of_differences

LENGTH = 60_000.0
PLACES = ([47.20, 46.85, 47.20], [11.10, 11.95, 11.10])


def test_both_orders_against_the_formula_at_a_geodesic_distance():
    distance = Geod(ellps="sphere").inv(11.10, 47.20, 11.95, 46.85)[2] / LENGTH
    for order, expected in (
        (1, np.exp(-distance)),
        (2, (1.0 + distance) * np.exp(-distance)),
    ):
        found = ErrorModel(0.02, LENGTH, order=order).correlation(*PLACES)
        # the sphere of pyproj has R = 6 370 997 m, 2e-6 below the mean radius
        assert_close(found[0, 1], expected, tolerance=1e-5)
        assert found[0, 2] == 1.0
        assert np.array_equal(found, found.T)


def test_the_correlation_length_is_where_it_says():
    north = np.degrees(LENGTH / 6_371_008.7714)
    for order, expected in ((1, np.exp(-1.0)), (2, 2.0 * np.exp(-1.0))):
        found = ErrorModel(0.02, LENGTH, order=order).correlation([0.0, north], [0.0, 0.0])
        assert_close(found[0, 1], expected, tolerance=1e-5)


def test_a_white_share_belongs_to_each_place_alone():
    model = ErrorModel(0.02, 1e9, white_share=0.25)
    assert model.covariance(*PLACES)[0, 1] == pytest.approx(0.75 * 0.02**2, rel=1e-3)
    assert model.covariance(*PLACES)[0, 2] == pytest.approx(0.02**2)


def test_the_u_of_a_difference():
    """u(A - B)² = 2 u² (1 - ρ): nothing for one place, 2 u² for places far apart."""
    model = ErrorModel(0.02, LENGTH)
    pairs = [(0, 1), (1, 2), (0, 2)]
    found = covariance_of_differences(model.covariance(*PLACES), pairs)
    rho = model.correlation(*PLACES)[0, 1]
    assert found[0, 0] == pytest.approx(2.0 * 0.02**2 * (1.0 - rho))
    assert found[2, 2] == pytest.approx(0.0, abs=1e-18)
    assert found[0, 1] == pytest.approx(-found[0, 0])
    far = covariance_of_differences(model.covariance([0.0, 40.0], [0.0, 90.0]), [(0, 1)])
    assert far[0, 0] == pytest.approx(2.0 * 0.02**2)


@given(
    st.lists(st.tuples(st.floats(-90.0, 90.0), st.floats(-180.0, 180.0)), min_size=2, max_size=12),
    st.sampled_from([1, 2]),
    st.floats(1e3, 2e7),
)
def test_the_covariance_is_never_negative(places, order, length):
    latitude, longitude = np.transpose(places)
    covariance = ErrorModel(1.0, length, order=order).covariance(latitude, longitude)
    assert np.linalg.eigvalsh(covariance).min() > -1e-9


def test_an_unknown_length_is_not_guessed():
    model = ErrorModel(0.5)
    assert np.array_equal(model.covariance([47.0], [11.0]), [[0.25]])
    assert np.array_equal(model.covariance([47.0, 47.0], [11.0, 11.0]), np.full((2, 2), 0.25))
    with pytest.raises(ConventionError, match=r"correlation length .* is not stated"):
        model.covariance([47.0, 48.0], [11.0, 11.0])


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"u": -0.01}, "error model of a geoid is out of range: u -0.01"),
        ({"u": float("nan")}, "error model of a geoid is out of range: u nan"),
        ({"u": 0.1, "order": 3}, "order 3"),
        ({"u": 0.1, "white_share": 1.5}, "white share 1.5"),
        ({"u": 0.1, "correlation_length": 0.0}, "correlation length must be positive: 0.0 m"),
    ],
)
def test_models_out_of_range(options, message):
    with pytest.raises(DataError, match=message):
        ErrorModel(**options)


def test_pairs_that_are_not_there():
    with pytest.raises(DataError, match=r"not there: \(0, 3\).*Places 0 to 2"):
        covariance_of_differences(np.eye(3), [(0, 1), (0, 3)])
    with pytest.raises(DataError, match="latitude out of range: 95"):
        ErrorModel(0.1, LENGTH).covariance([95.0, 0.0], [0.0, 0.0])
