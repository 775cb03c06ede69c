"""The normal field against printed constants, mpmath at 40 digits, and boule."""

from __future__ import annotations

import boule
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from mpmath import mp, mpf

from checks import assert_close, assert_published
from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import (
    normal_geopotential_number,
    normal_gravity,
    normal_potential,
    reference_ellipsoid,
)
from clockgeo.gravity.normal_field import cartesian, geocentric_radius

# Moritz 1980, Geodetic Reference System 1980, Bull. Geod. 54:395.
GRS80_PRINTED = {
    "semiminor_axis": "6356752.3141",
    "linear_eccentricity": "521854.0097",
    "gravity_equator": "9.7803267715",
    "gravity_pole": "9.8321863685",
    "reference_normal_gravity_potential": "62636860.850",
}
# NIMA TR8350.2; from memory.
WGS84_PRINTED = {
    "gravity_equator": "9.7803253359",
    "gravity_pole": "9.8321849378",
    "reference_normal_gravity_potential": "62636851.7146",
}


@pytest.mark.parametrize(("name", "printed"), GRS80_PRINTED.items())
def test_grs80_has_its_published_constants(name, printed):
    assert_published(getattr(reference_ellipsoid("grs80"), name), printed)


@pytest.mark.parametrize(("name", "printed"), WGS84_PRINTED.items())
def test_wgs84_has_its_published_constants(name, printed):
    # the printed polar gravity is cut, not rounded: one unit
    assert_published(getattr(reference_ellipsoid("wgs84"), name), printed, units=1)


def test_normal_gravity_at_45_degrees_is_the_published_one():
    # Moritz 1980, from memory
    assert_published(normal_gravity(45.0), "9.806199203")


# Closed formulas evaluated with mpmath at 40 digits: latitude, height, C, gamma(h).
EXACT = [
    (0, 100, "978.017238405057", "9.78001799899"),
    (0, 4000, "39096.6201903286", "9.76798719348"),
    (30, 1000, "9791.70559585981", "9.79016273004"),
    (45, 1000, "9804.65664520083", "9.80311432963"),
    (52, 100, "981.232125964003", "9.81216701125"),
    (60, 4000, "39252.0530398765", "9.80685199654"),
    (90, 4000, "39304.0938121873", "9.81986439636"),
]


@pytest.mark.parametrize(("latitude", "height", "number", "gravity"), EXACT)
def test_number_and_gravity_aloft(latitude, height, number, gravity):
    # 40 units of the last digit, 4e-9 m2 s-2: boule's flattening of GRS80 is exact to 4e-13
    assert_published(normal_geopotential_number(latitude, height), number, units=400)
    # 15 units of the last digit, 1.5e-10 m s-2: q and q0 cancel to 11 digits in boule
    assert_published(normal_gravity(latitude, height), gravity, units=15)


def reference_potential(latitude, height):
    """U of GRS80 from the textbook formula at 40 digits (Heiskanen and Moritz 1967, 2-62)."""
    with mp.workdps(40):
        body = reference_ellipsoid("grs80")
        a, f = mpf(body.semimajor_axis), mpf(body.flattening)
        gm, omega = mpf(body.geocentric_grav_const), mpf(body.angular_velocity)
        b = a * (1 - f)
        e2, phi, h = 1 - (b / a) ** 2, mp.radians(mpf(latitude)), mpf(height)
        n = a / mp.sqrt(1 - e2 * mp.sin(phi) ** 2)
        p, z = (n + h) * mp.cos(phi), (n * (1 - e2) + h) * mp.sin(phi)
        E = mp.sqrt(a**2 - b**2)
        d = p**2 + z**2 - E**2
        u = mp.sqrt(d / 2 * (1 + mp.sqrt(1 + 4 * E**2 * z**2 / d**2)))

        def q(x):
            return ((1 + 3 * x**2 / E**2) * mp.atan(E / x) - 3 * x / E) / 2

        sine2 = (z / u) ** 2
        return (
            gm / E * mp.atan(E / u)
            + omega**2 * a**2 / 2 * q(u) / q(b) * (sine2 - mpf(1) / 3)
            + omega**2 / 2 * (u**2 + E**2) * (1 - sine2)
        )


@pytest.mark.parametrize("latitude", [-90.0, -37.2, 0.0, 12.5, 45.0, 52.3, 89.999])
@pytest.mark.parametrize("height", [-4000.0, -0.001, 1e-6, 1.0, 450.0, 8848.0, 400_000.0])
def test_closed_form_equals_forty_digits(latitude, height):
    with mp.workdps(40):
        expected = float(reference_potential(latitude, 0) - reference_potential(latitude, height))
    # rounding of 1 - q/q0, times ω²a²/2 = 1e5, is 5e-11; the rest keeps float64's 16 digits
    tolerance = 5e-11 + 4e-15 * abs(expected)
    assert abs(normal_geopotential_number(latitude, height) - expected) < tolerance


def test_potential_agrees_with_boule():
    latitude, height = np.meshgrid(np.linspace(-90, 90, 37), [0.0, 500.0, 9000.0])
    other = boule.GRS80.normal_gravity_potential((None, latitude, height))
    # q and q0 cancel to 11 digits in boule, times ω²a²/2 = 1e5; ours stands against 40 digits above
    assert np.max(np.abs(normal_potential(latitude, height) - other)) < 1e-5


def test_gravity_is_the_gradient_at_forty_digits():
    """Second route below and above the ellipsoid: the radial and latitudinal slopes of U."""
    for latitude, height in [(52.3, -100.0), (20.0, -430.0), (70.0, 3000.0)]:
        with mp.workdps(40):
            step, radius = mpf("1e-6"), mpf("6.37e6")
            up = [reference_potential(latitude, mpf(height) + s * step) for s in (1, -1)]
            angle = mp.degrees(step / radius)
            north = [reference_potential(mpf(latitude) + s * angle, height) for s in (1, -1)]
            slope = [float((high - low) / (2 * step)) for high, low in (up, north)]
        # the northern step on the sphere is 1 % wrong for a slope of 1e-5
        assert_close(normal_gravity(latitude, height), float(np.hypot(*slope)), tolerance=3e-10)


def test_number_vanishes_on_the_ellipsoid_and_gravity_is_its_slope():
    latitude = np.linspace(-90, 90, 19)
    assert np.array_equal(normal_geopotential_number(latitude, 0.0), np.zeros(19))
    slope = normal_geopotential_number(latitude, 1000.5) - normal_geopotential_number(
        latitude, 999.5
    )
    # the vertical and the normal of the ellipsoid differ by 1e-6 rad at 1 km
    assert np.max(np.abs(slope - normal_gravity(latitude, 1000.0))) < 2e-10


@given(st.floats(-90, 90), st.floats(-10_000, 9_000), st.floats(0.01, 100.0))
def test_number_grows_with_height(latitude, height, step):
    low = normal_geopotential_number(latitude, height)
    high = normal_geopotential_number(latitude, height + step)
    assert 9.7 * step < high - low < 9.9 * step


def test_cartesian_and_radius_agree_with_boule():
    x, y, z = cartesian(52.3, 10.5, 130.0)
    other = boule.GRS80.geodetic_to_cartesian((10.5, 52.3, 130.0))
    assert np.allclose([x, y, z], other, rtol=0, atol=1e-6)
    assert_close(geocentric_radius(52.3, 130.0), float(np.linalg.norm(other)), tolerance=1e-6)


def test_scalar_gives_scalar_and_arrays_broadcast():
    assert isinstance(normal_gravity(45.0), float)
    assert isinstance(normal_geopotential_number(45.0, 10.0), float)
    assert normal_geopotential_number([[0.0], [45.0]], [1.0, 2.0, 3.0]).shape == (2, 3)


def test_bad_input_is_refused():
    with pytest.raises(DataError, match=r"latitude out of range: 95.0"):
        normal_gravity(95.0)
    with pytest.raises(DataError, match=r"1 of 2 values"):
        normal_gravity([10.0, np.nan])
    with pytest.raises(DataError, match="height out of range: nan"):
        normal_geopotential_number(45.0, np.nan)
    with pytest.raises(ConventionError, match="unknown ellipsoid: 'sphere'"):
        reference_ellipsoid("sphere")
