"""Ellipsoidal heights to geopotential numbers: consistency, u, refusals."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import (
    Separation,
    normal_height,
    number_from_ellipsoidal_height,
    orthometric_height,
    require_independent_geoid,
)


def anomaly(**changes):
    values = {
        "value": 43.5,
        "u": 0.02,
        "quantity": "height_anomaly",
        "tide_system": "mean_tide",
        "zero_level": "height_reference",
    }
    return Separation(**{**values, **changes})


def test_normal_height_comes_back():
    number = number_from_ellipsoidal_height(
        130.0, anomaly(), latitude=52.3, height_tide_system="mean_tide", u_height=0.01
    )
    assert normal_height(number.value, 52.3) == pytest.approx(86.5, abs=1e-9)
    assert number.zero_level.name == "height_reference"
    assert number.tide_system == "mean_tide"
    # 9.8 m s-2 times the root sum square of 1 and 2 cm
    assert number.u == pytest.approx(9.8118 * np.hypot(0.01, 0.02), rel=1e-3)


def test_orthometric_height_with_measured_gravity():
    number = number_from_ellipsoidal_height(
        1000.0,
        anomaly(quantity="geoid_height"),
        latitude=46.0,
        height_tide_system="mean_tide",
        gravity=9.8045,
    )
    assert orthometric_height(number.value, 9.8045) == pytest.approx(956.5, abs=1e-9)


def test_unmeasured_gravity_costs_u():
    number = number_from_ellipsoidal_height(
        1043.5,
        anomaly(quantity="geoid_height", u=0.0),
        latitude=46.0,
        height_tide_system="mean_tide",
    )
    assert number.u == pytest.approx(1.5, rel=1e-6)


def test_tide_systems_of_height_and_separation_meet():
    """A tide-free height over a zero-tide quasigeoid: h + h2 Wp/γ - ζ - Wp/γ, and back by C."""
    wp, gamma = 0.9722 - 2.8841 * 0.5 - 0.0195 * 0.25, 9.806199203
    number = number_from_ellipsoidal_height(
        200.0,
        anomaly(value=40.0, tide_system="zero_tide"),
        latitude=45.0,
        height_tide_system="tide_free",
    )
    height = normal_height(number.value, 45.0)
    assert height == pytest.approx(160.0 + (0.6078 - 1.0) * wp / gamma, abs=1e-9)


def test_bad_input_is_refused():
    with pytest.raises(DataError, match=r"height_anomaly out of range: 4350\.0"):
        anomaly(value=4350.0)
    with pytest.raises(ConventionError, match="unknown kind of separation: 'depth'"):
        anomaly(quantity="depth")
    with pytest.raises(DataError, match="u of a separation must not be negative"):
        anomaly(u=-0.1)
    place = {"latitude": 52.3, "height_tide_system": "tide_free"}
    with pytest.raises(DataError, match=r"height out of range: 29032\.0.*feet"):
        number_from_ellipsoidal_height(29_032.0, anomaly(), **place)
    with pytest.raises(DataError, match="u of a height must not be negative"):
        number_from_ellipsoidal_height(130.0, anomaly(), **place, u_height=-0.1)
    with pytest.raises(ConventionError, match="unknown tide system: 'free'"):
        number_from_ellipsoidal_height(130.0, anomaly(), latitude=52.3, height_tide_system="free")


def test_a_hybrid_geoid_does_not_check_its_own_levelling():
    require_independent_geoid(geoid="model", fitted_to=None, levelling="old harbour")
    require_independent_geoid(geoid="model", fitted_to="new harbour", levelling="old harbour")
    with pytest.raises(
        ConventionError, match="hybrid geoid model was fitted to old harbour and cannot check"
    ):
        require_independent_geoid(geoid="model", fitted_to="Old Harbour", levelling="old harbour")
