"""Statistics of a time error with gaps through which it is continuous."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.frequency import TickSeries
from clockgeo.frequency.deviations import stability_curve
from clockgeo.frequency.phase_deviations import phase_stability_curve
from clockgeo.frequency.stability_statistics import STATISTICS
from frequency.power_laws import LAWS, power_law


@pytest.mark.parametrize("statistic", STATISTICS)
def test_a_complete_time_error_is_its_frequency(statistic, rng):
    y = rng.standard_normal(200)
    x = np.concatenate(([3.0], 3.0 + np.cumsum(y) * 0.5))
    found = phase_stability_curve(TickSeries(np.arange(201), x), statistic, interval=0.5)
    expected = stability_curve(TickSeries(np.arange(200), y), statistic, interval=0.5)
    np.testing.assert_allclose(found.deviation, expected.deviation, rtol=1e-9)
    np.testing.assert_array_equal(found.tau, expected.tau)


@pytest.mark.parametrize("alpha", LAWS)
@pytest.mark.parametrize("statistic", ["overlapping-allan", "overlapping-hadamard"])
def test_time_errors_missing_at_random_leave_no_bias(alpha, statistic, rng):
    # Against the complete record of the same draw, averaged: 25 % are there.
    seen, whole = np.zeros(3), np.zeros(3)
    tau = [1.0, 8.0, 64.0]
    for _ in range(60):
        x = np.cumsum(power_law(alpha, 8_192, rng))
        tick = np.flatnonzero(rng.random(x.size) < 0.25)
        part = phase_stability_curve(TickSeries(tick, x[tick]), statistic, interval=1.0, tau=tau)
        all_ = TickSeries(np.arange(x.size), x)
        seen += part.deviation**2
        whole += phase_stability_curve(all_, statistic, interval=1.0, tau=tau).deviation ** 2
        assert np.all((part.lower < part.deviation) & (part.deviation < part.upper))
    for ratio in np.sqrt(seen / whole):
        assert_close(ratio, 1.0, tolerance=0.06)  # four standard deviations of the sparsest


def test_bad_time_errors_are_refused():
    tick = np.array([0, 1, 3, 4, 6])
    with pytest.raises(DataError, match="time errors are not finite"):
        phase_stability_curve(TickSeries(tick, np.array([0.0, np.nan, 1, 2, 3])), interval=1.0)
    with pytest.raises(DataError, match="no complete set of time errors"):
        phase_stability_curve(
            TickSeries(np.array([0, 1, 5, 6, 20]), np.arange(5.0) ** 2), interval=1.0, tau=[3.0]
        )


def test_phase_noise_does_not_come_back_at_long_times():
    """White PM and white FM with gaps: few long averages may look like anything."""
    rng = np.random.default_rng(117)
    count = 40_000
    x = 3e-15 / np.sqrt(3.0) * rng.standard_normal(count) + np.cumsum(
        1e-15 * rng.standard_normal(count)
    )
    kept = np.flatnonzero(np.repeat(rng.random(count // 400) < 0.87, 400))
    curve = phase_stability_curve(TickSeries(kept, x[kept]), interval=1.0)
    laws = list(curve.noise)
    first = next(k for k, law in enumerate(laws) if law.endswith("_fm"))
    assert not any(law.endswith("_pm") for law in laws[first:])
