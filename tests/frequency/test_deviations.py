"""The ten statistics against the published sets, their definitions, and the laws they must obey."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_published
from clockgeo.frequency import TickSeries
from clockgeo.frequency.deviations import stability_curve
from frequency.published_sets import NINE, OF_NINE, OF_THOUSAND, RECOMPUTED_THOUSAND, thousand


def curve(y, statistic, tau="octave", **options):
    y = np.asarray(y, dtype=np.float64)
    tick = np.flatnonzero(np.isfinite(y)).astype(np.int64)
    return stability_curve(TickSeries(tick, y[tick]), statistic, interval=1.0, tau=tau, **options)


@pytest.mark.parametrize("statistic", OF_NINE)
def test_nine_points_to_all_printed_digits(statistic):
    found = curve(NINE, statistic, [1, 2]).deviation
    for value, printed in zip(found, OF_NINE[statistic], strict=True):
        assert_published(value, printed)


@pytest.mark.parametrize("statistic", OF_THOUSAND)
def test_thousand_points_to_all_printed_digits(statistic):
    found = curve(thousand(), statistic, [1, 10, 100]).deviation
    for value, printed in zip(found, OF_THOUSAND[statistic], strict=True):
        mantissa, exponent = f"{value:.12e}".split("e")
        assert exponent == printed.split("e")[1]
        assert_published(float(mantissa), printed.split("e")[0])
    np.testing.assert_allclose(found, RECOMPUTED_THOUSAND[statistic], rtol=2e-10)
