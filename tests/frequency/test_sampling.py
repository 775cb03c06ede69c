"""Ticks from jittered stamps: none lost, none doubled."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.frequency import estimate_interval, sample_ticks
from clockgeo.times import SECOND_NS, tai_from_iso, tai_from_mjd_utc

MICRODAY_NS = 86_400_000
START = int(tai_from_mjd_utc(60_400, 0))


def stamps(interval, kept, *, quantum_ns=MICRODAY_NS, shift=None):
    """Rounded stamps of the rows `kept` of a grid, and what their ticks must differ by."""
    kept = np.asarray(kept, dtype=np.int64)
    exact = kept * round(interval * SECOND_NS)
    if shift is not None:
        exact = exact + shift
    return START + (exact + quantum_ns // 2) // quantum_ns * quantum_ns, np.diff(kept)


@pytest.mark.parametrize("interval", [1.0, 1.037, 1.0568, 0.2, 10.0, 0.999])
def test_interval_and_ticks_of_complete_rows_rounded_to_a_microday(interval):
    tai, steps = stamps(interval, range(20_000))
    sampling = sample_ticks(tai)
    # Identity: stamps fix the interval to one rounding over the length of the record.
    assert abs(sampling.interval - interval) < 0.0864 / 20_000 * 1.1 + 0.25 * interval / 20_000
    np.testing.assert_array_equal(np.diff(sampling.tick), steps)
    assert sampling.interval == interval


def test_the_median_step_would_lose_a_tick_in_fifty():
    # The trap: steps of 1.0568 s print as 12 or 13 microdays, whose median is 1.0368 s.
    tai, _ = stamps(1.0568, range(5_000))
    assert np.median(np.diff(tai)) / SECOND_NS == 1.0368
    assert estimate_interval(tai) == 1.0568


@given(data=st.data(), interval=st.sampled_from([1.0, 1.0568]))
@settings(max_examples=40, deadline=None)
def test_missing_rows_and_jumps_keep_their_ticks(data, interval):
    seed = data.draw(st.integers(0, 2**32 - 1))
    lost = data.draw(st.floats(0.0, 0.7))
    rng = np.random.default_rng(seed)
    kept = np.flatnonzero(rng.random(4_000) >= lost)
    jumps = rng.integers(2, 1_000, 5)
    for jump in jumps:
        kept[int(rng.integers(1, kept.size)) :] += jump
    tai, steps = stamps(interval, kept)
    sampling = sample_ticks(tai)
    # The last digit of an estimated interval may be off; a jump of 1000 s then moves by no tick.
    np.testing.assert_array_equal(np.diff(sampling.tick), steps)


def test_jitter_at_the_ends_of_many_stretches_does_not_cost_digits():
    """Found by the test above: six stretches whose ends made 0.9999 s of 1 s."""
    rng = np.random.default_rng(1126)
    kept = np.flatnonzero(rng.random(4_000) >= 0.24466235455369303)
    for jump in rng.integers(2, 1_000, 5):
        kept[int(rng.integers(1, kept.size)) :] += jump
    tai, steps = stamps(1.0, kept)
    sampling = sample_ticks(tai)
    assert sampling.interval == 1.0
    np.testing.assert_array_equal(np.diff(sampling.tick), steps)


def test_restarts_off_the_grid_neither_lose_nor_double_a_tick():
    kept = np.arange(6_000)
    shift = np.zeros(6_000, dtype=np.int64)
    shift[2_000:] += round(10.4 * SECOND_NS)
    shift[4_000:] += round(333.45 * SECOND_NS)
    tai, _ = stamps(1.0, kept, shift=shift)
    sampling = sample_ticks(tai)
    steps = np.diff(sampling.tick)
    assert sampling.restarts == 2
    assert np.count_nonzero(steps != 1) == 2
    assert steps[1_999] in {11, 12}
    assert steps[3_999] in {334, 335}


def test_wandering_stamps_do_not_cost_ticks(rng):
    # The computer's clock gains a part in 10^4: two ticks in six hours, as in real records.
    exact = np.arange(20_000) * 1.0568 * (1.0 + 1e-4 * np.sin(np.arange(20_000) / 3_000))
    tai = START + np.rint(exact / 0.0864).astype(np.int64) * MICRODAY_NS
    sampling = sample_ticks(tai)
    np.testing.assert_array_equal(np.diff(sampling.tick), np.ones(19_999))
    assert sampling.wander > 0.5


def test_stamps_coarser_than_half_an_interval_are_followed():
    tai, steps = stamps(1.0, range(5_000), quantum_ns=10 * MICRODAY_NS)
    assert set(np.diff(tai) // (10 * MICRODAY_NS)) == {1, 2}
    sampling = sample_ticks(tai)
    assert sampling.interval == 1.0
    np.testing.assert_array_equal(np.diff(sampling.tick), steps)


def test_coarse_stamps_with_missing_rows_need_a_stated_interval(rng):
    kept = np.flatnonzero(rng.random(5_000) > 0.2)
    tai, steps = stamps(1.0, kept, quantum_ns=10 * MICRODAY_NS)
    with pytest.raises(
        DataError, match=r"too coarse, and too many rows missing.*State the interval"
    ):
        sample_ticks(tai)
    sampling = sample_ticks(tai, interval=1.0)
    np.testing.assert_array_equal(np.diff(sampling.tick), steps)


def test_a_stated_interval_is_used():
    tai, _ = stamps(2.0, range(100))
    assert sample_ticks(tai, interval=2.0).interval == 2.0
    assert set(np.diff(sample_ticks(tai, interval=1.0).tick)) == {2}


def test_rows_faster_than_the_stated_interval_are_refused():
    tai, _ = stamps(1.0, range(100))
    with pytest.raises(DataError, match=r"rows come faster.*typical step 1.0005. s, interval 2 s"):
        sample_ticks(tai, interval=2.0)


def test_stamps_without_any_grid_are_refused(rng):
    tai = (
        START
        + np.cumsum(rng.exponential(1.0, 2_000) * SECOND_NS).astype(np.int64)
        + np.arange(2_000)
    )
    with pytest.raises(DataError, match="no common sampling interval"):
        sample_ticks(tai)


def test_a_leap_second_does_not_shift_the_grid():
    before = tai_from_iso("2016-12-31T23:00:00Z")
    after = tai_from_iso("2017-01-01T01:00:00Z")
    tai = np.arange(before, after + 1, SECOND_NS)
    # Two hours that held a leap second: 7201 s passed (IERS Bulletin C 52).
    assert tai.size == 7_202
    sampling = sample_ticks(tai)
    assert sampling.interval == 1.0
    np.testing.assert_array_equal(np.diff(sampling.tick), np.ones(7_201))


def test_two_records_of_one_interval_share_the_time_line(rng):
    first, _ = stamps(1.0, range(3_000))
    second, _ = stamps(1.0, range(100_000, 103_000))
    ticks = [sample_ticks(tai).tick for tai in (first, second)]
    assert ticks[1][0] - ticks[0][0] == 100_000


def test_one_row_needs_a_stated_interval():
    one = np.array([START])
    with pytest.raises(DataError, match="one row is not enough"):
        sample_ticks(one)
    assert sample_ticks(one, interval=1.0).tick.size == 1


def test_the_jitter_of_rounded_stamps_is_reported():
    # Limit: rounding to 0.0864 s spreads stamps evenly, sigma 0.0864/sqrt(12) = 0.025 s; the
    # robust figure of a difference of two even distributions is within a half of it.
    tai, _ = stamps(1.0568, range(10_000))
    assert 0.0125 < sample_ticks(tai).jitter < 0.0375
