"""The tide against another ephemeris, the permanent tide, and the published tide catalogue."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.gravity import (
    LOVE_NUMBERS,
    Place,
    doodson_argument,
    permanent_tide_on_crust,
    permanent_tide_potential,
    sky_positions,
    tidal_potential,
    tidal_potential_from,
)
from clockgeo.times import DAY_NS, SECOND_NS, tai_from_iso, tai_from_mjd_utc

NODE_PERIOD_DAYS = 6798.38  # of the Moon's node, 18.6 years


def at_mjd(mjd):
    return tai_from_mjd_utc(int(mjd), round(mjd % 1 * DAY_NS))


# Recomputed independently with ERFA's ephemerides: MJD (UTC), latitude, longitude, Moon 2, Moon 3,
# Sun 2, sum; m2 s-2, no Love numbers, permanent part included.
EPOCHS = [
    (60320.5, 52.3, 10.5, -1.8231, -0.0188, -0.6593, -2.5010),
    (60321.0, 52.3, 10.5, 2.8709, -0.0318, 1.0140, 3.8533),
    (60390.25, 52.3, 10.5, -1.3844, 0.0111, -0.7882, -2.1613),
    (60320.5, 0.0, 0.0, 2.8369, 0.0311, 1.3409, 4.2092),
]


@pytest.mark.parametrize("epoch", EPOCHS, ids=lambda epoch: f"{epoch[0]}")
def test_four_epochs(epoch):
    mjd, latitude, longitude, moon2, moon3, sun2, total = epoch
    tide = tidal_potential(at_mjd(mjd), Place(latitude, longitude))
    expected = {("moon", 2): moon2, ("moon", 3): moon3, ("sun", 2): sun2}
    for term, value in expected.items():
        assert_close(tide.terms[term][0], value, tolerance=1e-4, name=str(term))
    # Moon 4 and Sun 3 are in our sum and not in theirs: 3e-4
    assert_close(tide.generating[0], total, tolerance=5e-4)


@pytest.mark.parametrize("epoch", EPOCHS, ids=lambda epoch: f"{epoch[0]}")
def test_four_epochs_with_an_independent_ephemeris(independent_sky, epoch):
    tai, place = np.atleast_1d(at_mjd(epoch[0])), Place(epoch[1], epoch[2])
    other = tidal_potential_from(independent_sky(tai), place)
    # DE421 against the analytic theories: at most 3.3e-4 over four years
    assert_close(tidal_potential(tai, place).generating[0], other.generating[0], tolerance=5e-4)
    assert_close(other.generating[0], epoch[-1], tolerance=1e-3)


# skyfield with DE430 and its own Earth rotation, 2015-03-02, UT1 hour: V2, V3 at 52°N 10°E.
@pytest.mark.parametrize(
    ("hour", "degree2", "degree3"),
    [
        (3, -1.61944, -0.01257),
        (9, -1.23958, 0.02100),
        (15, -2.03878, -0.01020),
        (21, 1.23001, 0.00045),
    ],
)
def test_a_day_with_a_third_ephemeris(hour, degree2, degree3):
    tai = tai_from_iso(f"2015-03-02T{hour:02d}:00:00Z")
    terms = tidal_potential(tai, Place(52.0, 10.0)).terms
    # DE430 against the analytic theories, 3.3e-4 at most
    assert_close(terms["moon", 2][0] + terms["sun", 2][0], degree2, tolerance=5e-4)
    assert_close(terms["moon", 3][0] + terms["sun", 3][0], degree3, tolerance=2e-5)


def test_four_years_with_an_independent_ephemeris(independent_sky, rng):
    start = tai_from_iso("2022-01-01T00:00:00Z")
    tai = np.sort(start + rng.integers(0, 4 * 365 * DAY_NS, 1500))
    place = Place(-33.0, 151.0, 200.0)
    difference = (
        tidal_potential(tai, place).generating
        - tidal_potential_from(independent_sky(tai), place).generating
    )
    assert np.max(np.abs(difference)) < 5e-4


def test_a_time_error_of_37_seconds_is_visible():
    """TAI taken for UTC: at the steepest part 0.016 m² s⁻², eight times what the checks allow."""
    tai = tai_from_iso("2024-01-01T00:00:00Z") + np.arange(0, 30 * 24 * 4) * 900 * SECOND_NS
    place = Place(45.0, 10.5)
    error = np.abs(
        tidal_potential(tai + 37 * SECOND_NS, place).generating
        - tidal_potential(tai, place).generating
    )
    assert_close(np.max(error), 0.0160, tolerance=0.0005)


def test_half_a_second_of_earth_rotation_is_not():
    tai = tai_from_iso("2024-01-01T00:00:00Z") + np.arange(0, 30 * 24) * 3600 * SECOND_NS
    place = Place(0.0, 10.5)
    shifted = tidal_potential(tai, place, ut1_minus_utc=0.5).generating
    assert 1e-4 < np.max(np.abs(shifted - tidal_potential(tai, place).generating)) < 4e-4


@pytest.fixture(scope="module")
def node_cycle():
    """18.6 years of sky, one of the Moon's node, at a step that no wave is a multiple of."""
    start = tai_from_iso("1990-01-01T00:00:00Z")
    tai = start + np.arange(0, round(NODE_PERIOD_DAYS * DAY_NS), round(3.1 * 3600 * SECOND_NS))
    return tai, sky_positions(tai)


@pytest.mark.parametrize("latitude", [0.0, 30.0, 52.3, 60.7, 90.0])
def test_long_mean_is_the_permanent_tide(node_cycle, latitude):
    tide = tidal_potential_from(node_cycle[1], Place(latitude, 10.5))
    degree2 = np.mean(tide.terms["moon", 2] + tide.terms["sun", 2])
    assert_close(degree2, float(permanent_tide_potential(latitude)), tolerance=5e-4)
    # the small means of degrees 3 and 4, and 0.694 of the difference above
    assert abs(np.mean(tide.variable)) < 5e-4


# Cartwright and Edden 1973, Geophys. J. R. astr. Soc. 33:253; amplitudes in m, from memory.
CATALOGUE = {
    "M2": ("255.555", 0.63192),
    "S2": ("273.555", 0.29400),
    "N2": ("245.655", 0.12099),
    "K1": ("165.555", 0.36878),
    "O1": ("145.555", 0.26221),
    "P1": ("163.555", 0.12203),
    "Mf": ("075.555", 0.06663),
    "Mm": ("065.455", 0.03518),
}
# Relative: 0.1 % and, for waves whose neighbours need 8.85 years to part from them, 0.5 %.
TOLERANCE = {"N2": 5e-3, "Mm": 5e-3}
OTHERS = """
    055.565 056.554 057.555 058.554 063.655 065.655 065.445 065.465 073.555 075.355 075.565
    085.455 085.465 093.555 095.355 115.855 117.655 125.755 125.745 127.555 127.545 135.655
    135.645 137.455 137.445 145.545 147.555 153.655 155.455 155.655 155.665 157.455 162.556
    163.545 164.556 165.545 165.565 166.554 167.555 173.655 175.455 175.465 183.555 185.355
    185.555 185.565 195.455 225.855 227.655 235.755 237.555 237.545 235.745 245.645 247.455
    253.755 254.556 255.545 263.655 265.455 265.445 265.655 271.557 272.556 274.554 275.555
    275.565 283.655 285.455
"""


def test_amplitudes_of_the_main_waves(node_cycle):
    """Least squares on degree 2 at 52°N; arguments from `doodson_argument`, so it is tested too."""
    tai, sky = node_cycle
    terms = tidal_potential_from(sky, Place(52.0, 10.0)).terms
    potential = terms["moon", 2] + terms["sun", 2]
    numbers = [*(doodson for doodson, _ in CATALOGUE.values()), *OTHERS.split()]
    phases = [doodson_argument(tai, doodson) for doodson in numbers]
    columns = [np.ones(tai.size), *itertools.chain(*((np.cos(p), np.sin(p)) for p in phases))]
    fit, *_ = np.linalg.lstsq(np.array(columns).T, potential, rcond=None)
    amplitudes = np.hypot(fit[1::2], fit[2::2])
    radius, gravity = 6378136.6, 9.79828685
    geodetic = np.radians(52.0)
    p, z = 6378137.0 * np.cos(geodetic), 6378137.0 * (1 - 0.00669438) * np.sin(geodetic)
    p, z = np.array([p, z]) / np.sqrt(1 - 0.00669438 * np.sin(geodetic) ** 2)
    r, sine, cosine = np.hypot(p, z), z / np.hypot(p, z), p / np.hypot(p, z)
    site = {
        "0": np.sqrt(5 / (4 * np.pi)) * abs(3 * sine**2 - 1) / 2,
        "1": 3 * np.sqrt(5 / (24 * np.pi)) * sine * cosine,
        "2": 3 * np.sqrt(5 / (96 * np.pi)) * cosine**2,
    }
    for (name, (doodson, published)), amplitude in zip(CATALOGUE.items(), amplitudes, strict=False):
        metres = amplitude / (gravity * (r / radius) ** 2 * site[doodson[0]])
        assert_close(
            metres, published, tolerance=TOLERANCE.get(name, 1.2e-3) * published, name=name
        )


@pytest.mark.parametrize(
    ("latitude", "lowest", "highest"),
    # extremes over 1990-2008, hourly, independent computation; 3 % for the coarser step here
    [(0.0, -3.037, 6.042), (45.0, -3.035, 5.091), (60.0, -3.027, 3.231)],
)
def test_size_of_the_tide(node_cycle, latitude, lowest, highest):
    tide = tidal_potential_from(node_cycle[1], Place(latitude, 10.0)).generating
    assert np.min(tide) == pytest.approx(lowest, rel=0.03)
    assert np.max(tide) == pytest.approx(highest, rel=0.03)


def test_love_numbers_by_degree():
    # IERS Conventions 2010 nominal values: 1 + k - h
    assert_close(LOVE_NUMBERS[2].on_crust, 0.6941, tolerance=1e-9)
    assert_close(LOVE_NUMBERS[3].on_crust, 0.801, tolerance=1e-9)
    tide = tidal_potential(at_mjd(60321.0), Place(52.3, 10.5))
    degree2 = tide.terms["moon", 2] + tide.terms["sun", 2]
    small = tide.on_crust - 0.6941 * degree2 - 0.801 * tide.terms["moon", 3]
    assert abs(small[0]) < 1e-3
    assert tide.variable[0] == pytest.approx(
        tide.on_crust[0] - permanent_tide_on_crust(52.3), abs=1e-12
    )


def test_the_moon_overhead_pulls_most():
    """Sign: the tide is positive, and C lowered, under the Moon and on the far side of it."""
    tai = np.atleast_1d(at_mjd(60320.5))
    x, y, z = sky_positions(tai).moon[0]
    longitude = float(np.degrees(np.arctan2(y, x)))
    latitude = float(np.degrees(np.arctan2(z, np.hypot(x, y))))
    under = tidal_potential(tai, Place(latitude, longitude)).terms["moon", 2][0]
    far = tidal_potential(tai, Place(-latitude, (longitude + 180) % 360)).terms["moon", 2][0]
    beside = tidal_potential(tai, Place(0.0, (longitude + 90) % 360)).terms["moon", 2][0]
    assert under > 2.5
    assert far == pytest.approx(under, rel=1e-3)
    assert beside == pytest.approx(-under / 2, rel=0.05)


def test_epochs_beyond_the_ephemeris_are_refused():
    with pytest.raises(DataError, match=r"end with the year 2099: 2150-01-01"):
        tidal_potential(tai_from_iso("2150-01-01T00:00:00Z"), Place(52.3, 10.5))
