"""Dead time against published figures, a spectral integral and limits."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate

from checks import assert_published
from clockgeo.errors import DataError
from clockgeo.frequency.dead_time import dead_time_variance, uptime_windows
from clockgeo.frequency.noise import NoiseModel

WINDOWS = [(0.0, 1.5), (4.0, 5.5)]
UNIT = {
    "h0": NoiseModel(white_fm=np.sqrt(0.5)),
    "h-1": NoiseModel(flicker_fm=np.sqrt(2.0 * np.log(2.0))),
    "h-2": NoiseModel(random_walk_fm=np.sqrt(2.0 * np.pi**2 / 3.0)),
}


@pytest.mark.parametrize(
    ("law", "printed"), [("h0", "0.1166667"), ("h-1", "0.7237255"), ("h-2", "12.5015")]
)
def test_two_windows_in_ten_seconds(law, printed):
    """T = 10, up in [0, 1.5] and [4, 5.5]; values recomputed from the spectral definition."""
    assert_published(dead_time_variance(UNIT[law], WINDOWS, 10.0), printed)


@pytest.mark.parametrize(("law", "exponent"), [("h-1", -1), ("h-2", -2)])
def test_against_the_integral_over_the_spectrum(law, exponent):
    def transfer(f):
        def window(a, b):
            return (np.exp(-2j * np.pi * f * a) - np.exp(-2j * np.pi * f * b)) / (2j * np.pi * f)

        up = sum(window(a, b) for a, b in WINDOWS) / 3.0
        return abs(window(0.0, 10.0) / 10.0 - up) ** 2

    def density(log_f):
        f = np.exp(log_f)
        return f ** (exponent + 1) * transfer(f)

    value, _ = integrate.quad(density, np.log(1e-6), np.log(2e3), limit=4000)
    found = dead_time_variance(UNIT[law], WINDOWS, 10.0)
    assert found == pytest.approx(value, rel=2e-3)


def test_without_dead_time_there_is_nothing_to_add():
    for model in UNIT.values():
        assert dead_time_variance(model, [(0.0, 10.0)], 10.0) < 1e-12


def test_levels_add_in_variance_and_scale_with_time():
    both = UNIT["h0"].combined(UNIT["h-1"])
    parts = [dead_time_variance(UNIT[law], WINDOWS, 10.0) for law in ("h0", "h-1")]
    assert dead_time_variance(both, WINDOWS, 10.0) == pytest.approx(sum(parts))
    # Flicker noise knows no scale of time.
    later = [(1e6 * a, 1e6 * b) for a, b in WINDOWS]
    assert dead_time_variance(UNIT["h-1"], later, 1e7) == pytest.approx(parts[1])


def test_windows_of_a_record():
    tick = np.array([5, 6, 7, 20, 21, 30])
    assert uptime_windows(tick, 2.0) == [(0.0, 6.0), (30.0, 34.0), (50.0, 52.0)]
    assert uptime_windows(tick, 2.0, bridge=10) == [(0.0, 6.0), (30.0, 52.0)]


@pytest.mark.parametrize(
    ("windows", "told"),
    [
        ([], "a window of uptime is empty: no window"),
        ([(2.0, 2.0)], "a window of uptime is empty"),
        ([(0.0, 3.0), (2.0, 4.0)], "windows of uptime overlap"),
        ([(0.0, 11.0)], "uptime reaches beyond the interval"),
    ],
)
def test_windows_that_make_no_sense_are_refused(windows, told):
    with pytest.raises(DataError, match=told):
        dead_time_variance(UNIT["h0"], windows, 10.0)
    with pytest.raises(DataError, match="the interval is empty"):
        dead_time_variance(UNIT["h0"], WINDOWS, 0.0)
