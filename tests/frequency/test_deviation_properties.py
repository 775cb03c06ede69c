"""Laws that every statistic obeys, whatever the record: shifts, drifts, scales, order of pieces."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.frequency import TickSeries
from clockgeo.frequency.deviations import stability_curve
from clockgeo.frequency.stability_statistics import STATISTICS

WITH_GAPS = [name for name, one in STATISTICS.items() if not one.total]
HADAMARD = [name for name in STATISTICS if "hadamard" in name]

seeds = st.integers(0, 2**32 - 1)
constants = st.floats(-1e3, 1e3).filter(lambda value: abs(value) > 1e-3)


def record(seed, *, gaps):
    """A white record of 300 ticks; every fifth run of ten is missing, and a few more samples."""
    rng = np.random.default_rng(seed)
    y = rng.standard_normal(300)
    tick = np.arange(300, dtype=np.int64)
    if gaps:
        seen = (tick % 50 < 40) & (rng.random(300) < 0.97)
        tick, y = tick[seen], y[seen]
    return tick, y


def deviation(tick, y, statistic):
    series = TickSeries(np.asarray(tick, dtype=np.int64), np.asarray(y))
    # The total family takes complete stretches, here of a dozen samples or more.
    tau = [1.0, 2.0] if STATISTICS[statistic].total else [1.0, 4.0, 16.0]
    return stability_curve(series, statistic, interval=1.0, tau=tau).deviation


def cases(names):
    return [(name, gaps) for name in names for gaps in (False, True)]


@pytest.mark.parametrize(("statistic", "gaps"), cases(STATISTICS))
@settings(max_examples=3)
@given(seed=seeds, constant=constants)
def test_an_added_constant_changes_nothing(statistic, gaps, seed, constant):
    tick, y = record(seed, gaps=gaps)
    np.testing.assert_allclose(
        deviation(tick, y + constant, statistic), deviation(tick, y, statistic), rtol=1e-8
    )


@pytest.mark.parametrize("statistic", HADAMARD)
@settings(max_examples=3)
@given(seed=seeds, drift=st.floats(-10.0, 10.0))
def test_the_hadamard_family_sees_no_drift(statistic, seed, drift):
    tick, y = record(seed, gaps=False)
    np.testing.assert_allclose(
        deviation(tick, y + drift * tick, statistic), deviation(tick, y, statistic), rtol=1e-7
    )


@pytest.mark.parametrize(("statistic", "gaps"), cases(STATISTICS))
@settings(max_examples=3)
@given(seed=seeds, factor=constants)
def test_a_factor_scales_by_its_size(statistic, gaps, seed, factor):
    tick, y = record(seed, gaps=gaps)
    np.testing.assert_allclose(
        deviation(tick, factor * y, statistic),
        abs(factor) * deviation(tick, y, statistic),
        rtol=1e-8,
    )


@pytest.mark.parametrize("statistic", WITH_GAPS)
@settings(max_examples=3)
@given(seed=seeds, ticks=st.integers(-(10**9), 10**9))
def test_where_the_line_begins_changes_nothing(statistic, seed, ticks):
    tick, y = record(seed, gaps=True)
    np.testing.assert_array_equal(
        deviation(tick + ticks, y, statistic), deviation(tick, y, statistic)
    )


@pytest.mark.parametrize("statistic", STATISTICS)
def test_time_reversed_records_tell_the_same(statistic):
    # Differences of even order or squared: the time line has no direction. Plain statistics begin
    # at the first sample, so the length is made a multiple of all windows.
    tick, y = record(3, gaps=False)
    tick, y = tick[:288], y[:288]
    np.testing.assert_allclose(
        deviation(tick, y[::-1], statistic), deviation(tick, y, statistic), rtol=1e-9
    )


def refused(match, y, *, tick=None, **options):
    tick = np.arange(len(y)) if tick is None else tick
    series = TickSeries(np.asarray(tick, dtype=np.int64), np.asarray(y, dtype=np.float64))
    options = {"interval": 1.0, "tau": [1.0], **options}
    for statistic in STATISTICS:
        with pytest.raises(DataError, match=match):
            stability_curve(series, statistic, **options)


def test_bad_input_is_refused_by_every_statistic():
    good = np.random.default_rng(1).standard_normal(50)
    refused("too few samples", [1.0])
    refused("too few samples", [])
    refused("constant", np.full(50, 3.0))
    refused("not finite", np.where(np.arange(50) == 7, np.nan, good))
    refused("not finite", np.where(np.arange(50) == 7, np.inf, good))
    refused("out of reach", good, tau=[1e6])
    refused("out of reach", good, tau=[0.0])
    refused("out of reach", good, tau=[np.nan])
    refused("unknown choice", good, tau="sometimes")
    refused("interval must be positive", good, interval=0.0)
    refused("confidence level", good, level=1.0)
    with pytest.raises(DataError, match="no such statistic"):
        stability_curve(TickSeries(np.arange(50), good), "median", interval=1.0)


def test_what_comes_out_is_finite_and_in_order():
    tick, y = record(11, gaps=True)
    for statistic in STATISTICS:
        curve = stability_curve(TickSeries(tick, y), statistic, interval=0.5, tau="all", level=0.9)
        assert np.all(np.diff(curve.tau) > 0.0)
        assert np.all(curve.lower > 0.0)
        assert np.all(curve.lower < curve.deviation)
        assert np.all(curve.deviation < curve.upper)
        assert np.all(np.isfinite(curve.edf) & (curve.edf >= 1.0))
        assert np.all(curve.count >= 1)
