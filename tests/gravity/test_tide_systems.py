"""Tide systems: published formulas, consistency between quantities, refusal of mixes."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_close, assert_published
from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import (
    TidalQuantity,
    TideSystem,
    convert_tide_system,
    mean_tide_height_evrf2019,
    normal_gravity,
    permanent_tide_potential,
    require_same_tide_system,
    tide_system_shift,
    zero_tide_height_evrf2019,
)

SYSTEMS = st.sampled_from(list(TideSystem))
QUANTITIES = st.sampled_from(list(TidalQuantity))
LATITUDES = st.floats(-90, 90)


@pytest.mark.parametrize(
    ("latitude", "potential"),
    # 0.9722 - 2.8841 sin² - 0.0195 sin⁴ (Mäkinen and Ihde 2009, from memory), evaluated by hand
    [(0, "0.9722"), (30, "0.2500"), (45, "-0.4747"), (52, "-0.8262"), (90, "-1.9314")],
)
def test_permanent_tide(latitude, potential):
    assert_published(permanent_tide_potential(latitude), potential)


def test_permanent_tide_follows_from_the_constant_term_of_the_tide():
    """Second route: H0 = -0.31460 m (IERS Conventions 2010), degree 2, on the ellipsoid."""
    gm, re, h0, e2 = 3.986004418e14, 6378136.6, -0.31460, 0.00669438
    amplitude = gm / re**2 * h0 * np.sqrt(5 / (4 * np.pi))
    for latitude in (0.0, 30.0, 52.3, 60.7, 90.0):
        phi = np.radians(latitude)
        n = 6378137.0 / np.sqrt(1 - e2 * np.sin(phi) ** 2)
        p, z = n * np.cos(phi), n * (1 - e2) * np.sin(phi)
        r2, sine2 = p**2 + z**2, z**2 / (p**2 + z**2)
        expected = amplitude * r2 / re**2 * (3 * sine2 - 1) / 2
        # the polynomial has four decimals and two terms
        assert_close(permanent_tide_potential(latitude), expected, tolerance=1.2e-4)


@pytest.mark.parametrize(
    ("latitude", "shift"),
    # EVRF2019 zero -> mean, m: the registry formula evaluated independently
    [(0, "-0.18533"), (30, "-0.11145"), (45, "-0.03752"), (60, "0.03646"), (90, "0.11050")],
)
def test_evrf2019_shift(latitude, shift):
    assert_published(mean_tide_height_evrf2019(0.0, latitude), shift)


def test_epsg_method_1107_example():
    # EPSG registry, method 1107: 100.154 m at 50°55'01.5"N becomes 100.147 m
    latitude = 50 + 55 / 60 + 1.5 / 3600
    assert_published(mean_tide_height_evrf2019(100.154, latitude), "100.147")
    assert zero_tide_height_evrf2019(
        mean_tide_height_evrf2019(100.154, latitude), latitude
    ) == pytest.approx(100.154, abs=1e-12)


@given(QUANTITIES, LATITUDES, st.floats(-1e5, 1e5), st.sampled_from(["crust", "space"]))
def test_going_round_is_the_identity(quantity, latitude, value, fixed_in):
    here, path = value, ["zero_tide", "mean_tide", "tide_free", "zero_tide"]
    for source, target in itertools.pairwise(path):
        here = convert_tide_system(
            here, latitude, quantity=quantity, source=source, target=target, fixed_in=fixed_in
        )
    assert abs(here - value) < 1e-9


@given(QUANTITIES, LATITUDES, SYSTEMS, SYSTEMS)
def test_there_and_back_cancel(quantity, latitude, source, target):
    there = tide_system_shift(quantity, latitude, source=source, target=target)
    back = tide_system_shift(quantity, latitude, source=target, target=source)
    assert there == -back


@given(LATITUDES, SYSTEMS, SYSTEMS)
def test_height_is_ellipsoidal_height_minus_geoid_height_in_every_system(latitude, source, target):
    physical, ellipsoidal, geoid, anomaly, number, potential = (
        tide_system_shift(quantity, latitude, source=source, target=target)
        for quantity in (
            "physical_height",
            "ellipsoidal_height",
            "geoid_height",
            "height_anomaly",
            "geopotential_number",
            "potential",
        )
    )
    assert physical == pytest.approx(ellipsoidal - geoid, abs=1e-12)
    assert anomaly == geoid
    assert number == pytest.approx(physical * normal_gravity(latitude), abs=1e-12)
    assert potential == -number


def test_signs_of_each_quantity():
    wp = permanent_tide_potential(52.3)
    assert wp < 0
    to_mean = {"source": "zero_tide", "target": "mean_tide"}
    assert tide_system_shift("potential", 52.3, **to_mean) == wp
    assert tide_system_shift("geopotential_number", 52.3, **to_mean) == -wp
    assert tide_system_shift("ellipsoidal_height", 52.3, **to_mean) == 0.0
    to_zero = {"source": "tide_free", "target": "zero_tide"}
    # W_zero = W_tidefree + k Wp at a fixed point, k = 0.30190
    assert tide_system_shift("potential", 52.3, **to_zero, fixed_in="space") == pytest.approx(
        0.30190 * wp
    )
    assert tide_system_shift("geoid_height", 52.3, **to_zero) == pytest.approx(
        0.30190 * wp / normal_gravity(52.3)
    )


@pytest.mark.parametrize("latitude", [0.0, 30.0, 60.0])
def test_radial_permanent_displacement(latitude):
    # IERS Conventions 2010, section 7.1.1.2 (from memory): -0.1206 + 0.0001 P2, times P2, m
    geocentric = np.arctan((1 - 0.00669438) * np.tan(np.radians(latitude)))
    p2 = (3 * np.sin(geocentric) ** 2 - 1) / 2
    shift = tide_system_shift(
        "ellipsoidal_height", latitude, source="tide_free", target="mean_tide"
    )
    # one constant h2 on the ellipsoid against latitude-dependent numbers on the sphere
    assert_close(shift, (-0.1206 + 0.0001 * p2) * p2, tolerance=0.0006)


@pytest.mark.parametrize("latitude", [0.0, 45.0, 80.0])
def test_gravity_follows_ekman(latitude):
    # Ekman 1989, Bull. Geod. 63:281 (from memory): g_mean - g_zero = -30.4 + 91.2 sin² µGal
    shift = tide_system_shift("gravity", latitude, source="zero_tide", target="mean_tide")
    expected = (-30.4 + 91.2 * np.sin(np.radians(latitude)) ** 2) * 1e-8
    # geodetic against spherical latitude: half a microgal
    assert_close(shift, expected, tolerance=0.6e-8)


def test_a_datum_point_keeps_its_number():
    options = {"source": "zero_tide", "target": "mean_tide", "datum_latitude": 52.38}
    assert tide_system_shift("geopotential_number", 52.38, **options) == 0.0
    assert tide_system_shift("physical_height", 60.7, **options) > 0.0
    with pytest.raises(ConventionError, match=r"a datum latitude goes with.*: geoid_height"):
        tide_system_shift("geoid_height", 60.7, **options)


def test_a_mix_names_both_parties():
    assert require_same_tide_system({"a": "mean_tide", "b": TideSystem.MEAN_TIDE}) == "mean_tide"
    with pytest.raises(ConventionError, match=r"campaign is mean_tide, grid egm\.nc is zero_tide"):
        require_same_tide_system({"campaign": "mean_tide", "grid egm.nc": "zero_tide"})


def test_bad_input_is_refused():
    with pytest.raises(ConventionError, match=r"unknown tide system: 'free'.*zero_tide, tide_free"):
        tide_system_shift("potential", 52.0, source="free", target="mean_tide")
    with pytest.raises(ConventionError, match=r"unknown quantity .*: 'depth'"):
        tide_system_shift("depth", 52.0, source="zero_tide", target="mean_tide")
    with pytest.raises(ConventionError, match="unknown kind of point: 'air'"):
        tide_system_shift("potential", 52.0, source="zero_tide", target="mean_tide", fixed_in="air")
    with pytest.raises(DataError, match=r"latitude out of range: 95.0"):
        permanent_tide_potential(95.0)


def test_arrays_go_through():
    values = convert_tide_system(
        np.zeros(3), [0, 45, 90], quantity="potential", source="zero_tide", target="mean_tide"
    )
    assert np.allclose(values, permanent_tide_potential(np.array([0, 45, 90])))
