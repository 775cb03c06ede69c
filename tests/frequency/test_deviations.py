"""The ten statistics against the published sets, their definitions, and the laws they must obey."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_published
from clockgeo.errors import DataError
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


@pytest.mark.parametrize("statistic", ["total", "modified-total", "hadamard-total"])
def test_total_statistics_take_every_complete_stretch(statistic):
    """Equal stretches: the mean of their variances; and truth is met where one stretch is short."""
    rng = np.random.default_rng(14)
    y = rng.standard_normal(4_000)
    tick = np.arange(4_000) + 10 * (np.arange(4_000) // 100)
    curve = stability_curve(TickSeries(tick, y), statistic, interval=1.0, tau=[8.0])
    single = [
        stability_curve(TickSeries(np.arange(100), part), statistic, interval=1.0, tau=[8.0])
        for part in y.reshape(40, 100)
    ]
    # Each stretch alone would name its own noise and its own bias; white noise is what most say.
    white = [one.deviation[0] ** 2 for one in single if one.noise[0] == "white_fm"]
    assert curve.deviation[0] ** 2 == pytest.approx(np.mean(white), rel=0.1)
    assert curve.count[0] == sum(one.count[0] for one in single)
    assert curve.edf[0] > 30 * single[0].edf[0]
    halved = 2.0 if statistic == "modified-total" else 1.0
    assert curve.deviation[0] == pytest.approx((8.0 * halved) ** -0.5, rel=0.12)
    assert any("40 complete stretches with 4000 of 4000 samples" in note for note in curve.notes)


def test_a_record_of_single_samples_has_no_total_statistic():
    series = TickSeries(np.arange(0, 60, 2), np.arange(30.0))
    with pytest.raises(DataError, match=r"no complete stretch is long enough.*1 samples"):
        stability_curve(series, "total", interval=1.0)
