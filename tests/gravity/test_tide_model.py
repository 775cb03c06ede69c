"""Interpolation of the tide, its mean over valid epochs, and the u of that mean."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from clockgeo.constants import SPEED_OF_LIGHT_SQUARED
from clockgeo.errors import DataError
from clockgeo.gravity import (
    Constituent,
    LoadTable,
    Place,
    PoleCoordinates,
    SiteTide,
    TideInterpolator,
    doodson_argument,
    tidal_potential,
)
from clockgeo.times import DAY_NS, SECOND_NS, tai_from_iso

START = tai_from_iso("2027-03-01T00:00:00Z")
BRISK = SiteTide(Place(0.0, 139.6, 90.0))
INLAND = SiteTide(Place(52.3, 10.5, 130.0))
LOAD = LoadTable(
    constituents=(
        Constituent(
            constituent="M2",
            doodson="255.555",
            height_amplitude_m=0.01,
            height_phase_deg=30.0,
            potential_amplitude_m2_s2=0.02,
            potential_phase_deg=-60.0,
            u_height_m=0.001,
        ),
    )
)


@given(
    st.floats(-90, 90),
    st.floats(-180, 180),
    st.integers(0, 300 * DAY_NS),
    st.integers(0, 3 * DAY_NS),
)
@settings(max_examples=30)
def test_interpolation_error_is_below_1e21(latitude, longitude, later, length):
    start, stop = START + later, START + later + length
    tide = TideInterpolator(start, stop, SiteTide(Place(latitude, longitude)), INLAND)
    epochs = np.linspace(start, stop, 97).astype(np.int64).clip(start, stop)
    error = np.max(np.abs(tide(epochs) - tide.exactly(epochs)))
    assert error / SPEED_OF_LIGHT_SQUARED.value < 1e-21
    assert tide.largest_error() / SPEED_OF_LIGHT_SQUARED.value < 1e-21


def test_difference_of_two_sites_is_the_difference():
    epochs = START + np.arange(0, 2 * DAY_NS, 977 * SECOND_NS)
    ends = int(epochs[0]), int(epochs[-1])
    pair = TideInterpolator(*ends, BRISK, INLAND)(epochs)
    apart = TideInterpolator(*ends, BRISK)(epochs) - TideInterpolator(*ends, INLAND)(epochs)
    assert np.allclose(pair, apart, rtol=0, atol=1e-12)
    exact = tidal_potential(epochs, BRISK.place).variable
    assert np.allclose(TideInterpolator(*ends, BRISK)(epochs), exact, rtol=0, atol=5e-5)


def test_a_site_against_itself_feels_nothing():
    tide = TideInterpolator(START, START + DAY_NS, INLAND, INLAND)
    mean = tide.mean(START + np.arange(100) * SECOND_NS)
    assert mean.potential == 0.0
    assert mean.u == 0.0


def test_mean_counts_the_valid_epochs_only():
    epochs = START + np.arange(86_400) * SECOND_NS
    valid = epochs[(np.arange(86_400) // 3600) % 6 < 2]
    tide = TideInterpolator(START, START + DAY_NS, INLAND)
    mean = tide.mean(valid)
    exact = np.mean(tidal_potential(valid[::60], INLAND.place).variable)
    assert mean.potential == pytest.approx(exact, abs=1e-3)
    assert abs(mean.potential - tide.mean(epochs).potential) > 0.01
    assert mean.neglected


def test_residual_of_a_long_mean_is_small():
    # common knowledge of the field: 28 days leave at most 0.08 m2 s-2
    epochs = START + np.arange(0, 28 * DAY_NS, 600 * SECOND_NS)
    mean = TideInterpolator(int(epochs[0]), int(epochs[-1]), INLAND).mean(epochs)
    assert abs(mean.potential) < 0.08
    assert mean.u < 0.01


def test_u_covers_the_resonance_that_is_left_out(rng):
    """Truth: K1 is amplified by 6 % and M2 loaded by 2 % of unknown phase; sessions of 6 hours."""
    ratios = []
    for _ in range(60):
        begin = START + int(rng.integers(0, 300 * DAY_NS))
        epochs = begin + np.arange(0, 6 * 3600, 60) * SECOND_NS
        k1 = 0.06 * 0.694 * 1.351 * np.cos(doodson_argument(epochs, "165.555"))
        m2 = (
            0.02
            * 0.694
            * 0.910
            * np.cos(doodson_argument(epochs, "255.555") + rng.uniform(0, 2 * np.pi))
        )
        u = TideInterpolator(int(epochs[0]), int(epochs[-1]), INLAND).mean(epochs).u
        ratios.append(np.mean(k1 + m2) / u)
    # a standard uncertainty: the normalised error scatters by about one or a little less
    assert 0.3 < np.sqrt(np.mean(np.square(ratios))) < 1.2


def test_pole_and_load_enter_and_carry_u():
    pole = PoleCoordinates(
        np.array([START, START + DAY_NS]), np.array([0.3, 0.3]), np.array([0.1, 0.1])
    )
    full = SiteTide(INLAND.place, pole, LOAD)
    epochs = START + np.arange(0, DAY_NS + 1, 600 * SECOND_NS)
    tide = TideInterpolator(START, START + DAY_NS, full)
    plain = TideInterpolator(START, START + DAY_NS, INLAND)
    added = tide(epochs) - plain(epochs)
    assert 0.02 < np.mean(np.abs(added)) < 0.3
    assert np.max(np.abs(tide(epochs) - tide.exactly(epochs))) < 5e-5
    hour = epochs[:6]
    assert tide.mean(hour).u == pytest.approx(np.hypot(plain.mean(hour).u, LOAD.u), rel=1e-3)


def test_bad_spans_and_epochs_are_refused():
    tide = TideInterpolator(START, START + DAY_NS, INLAND)
    with pytest.raises(DataError, match=r"outside the tide's span: 2027-03-02T00:00:01"):
        tide([START + DAY_NS + SECOND_NS])
    with pytest.raises(DataError, match="at least one valid epoch"):
        tide.mean([])
    with pytest.raises(DataError, match=r"ends before it starts: 2027-03-01.* to 2027-02-28"):
        TideInterpolator(START, START - DAY_NS, INLAND)
    pole = PoleCoordinates(np.array([START, START + 5]), np.zeros(2), np.zeros(2))
    with pytest.raises(DataError, match="do not cover the record"):
        TideInterpolator(START, START + DAY_NS, SiteTide(INLAND.place, pole))
