"""Screening by truth: what was put in is found, what is clean is left alone."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import lfilter
from scipy.stats import binom, norm

from clockgeo.errors import DataError
from clockgeo.frequency import Mask, Reason, Record, ScreeningRules, screen
from clockgeo.frequency.running import running_median_and_spread
from clockgeo.times import SECOND_NS, iso_utc, tai_from_iso

START = tai_from_iso("2027-03-01T00:00:00Z")
SR_HZ = 429_228_004_229_872.99


def record_of(y, *, tick=None, usable=None):
    y = np.asarray(y, dtype=float)
    tick = np.arange(y.size) if tick is None else np.asarray(tick)
    usable = np.isfinite(y) if usable is None else usable
    return Record("lab", START + tick * SECOND_NS, y, usable, 1.0, tick + START // SECOND_NS)


def servo_noise(rng, count, *, spread=1e-16):
    """Neighbours alike, swinging with a period near 20 rows, as a servo makes them."""
    decay, turn = 0.93, 2.0 * np.pi / 20.0
    drive = rng.normal(0.0, 1.0, count + 500)
    y = lfilter([1.0], [1.0, -2.0 * decay * np.cos(turn), decay**2], drive)[500:]
    return spread * y / np.std(y)


@pytest.mark.parametrize("threshold", [3.0, 4.0, 5.0])
def test_the_false_alarm_rate_of_white_noise_is_the_normal_tail(rng, threshold):
    count = 1_000_000
    rules = ScreeningRules(outlier_threshold=threshold)
    found = screen(record_of(rng.normal(0.0, 1e-16, count)), rules).counts["outlier"]
    # The spread is known to about 3 %: the rate is at most that of a threshold 3 % lower.
    lowest = binom.ppf(1e-4, count, 2.0 * norm.sf(threshold))
    highest = binom.ppf(1.0 - 1e-4, count, 2.0 * norm.sf(0.97 * threshold))
    assert lowest <= found <= highest


def test_clean_records_are_left_alone(rng):
    for count in (3, 10, 50, 300, 100_000):
        result = screen(record_of(rng.normal(0.0, 1e-16, count)))
        assert result.counts["outlier"] == 0
        assert result.mean_with == result.mean_without


def test_servo_noise_does_not_raise_false_alarms(rng):
    y = servo_noise(rng, 400_000)
    # The trap: the spread of differences is far smaller than that of the values.
    assert np.std(np.diff(y)) < 0.4 * np.std(y)
    assert screen(record_of(y)).counts["outlier"] == 0


@pytest.mark.parametrize("noise", ["white", "servo", "random walk"])
def test_outliers_of_twenty_times_the_spread_are_found(rng, noise):
    y = rng.normal(0.0, 1e-16, 50_000)
    if noise == "servo":
        y = servo_noise(rng, 50_000)
    if noise == "random walk":
        y += np.cumsum(rng.normal(0.0, 2e-18, 50_000))
    where = np.sort(rng.choice(50_000, 40, replace=False))
    y[where] += 20e-16 * rng.choice([-1.0, 1.0], 40)
    result = screen(record_of(y))
    np.testing.assert_array_equal(result.flagged(), where)
    assert result.counts["outlier"] == 40
    assert result.valid.sum() == 50_000 - 40


def test_outliers_do_not_hide_each_other(rng):
    # A fifth of a stretch is bad: the median and its spread stand up to it.
    y = rng.normal(0.0, 1e-16, 20_000)
    y[5_000:5_060] += 2e-15
    result = screen(record_of(y))
    assert set(range(5_000, 5_060)) <= set(result.flagged().tolist())
    assert result.counts["outlier"] == 60


def test_a_change_of_level_across_a_long_gap_is_no_outlier(rng):
    tick = np.concatenate([np.arange(3_000), np.arange(10_000, 10_025), np.arange(20_000, 23_000)])
    y = rng.normal(0.0, 1e-16, tick.size)
    y[3_000:] += 5e-15
    assert screen(record_of(y, tick=tick)).counts["outlier"] == 0


def test_gross_bounds_are_measured_from_the_median():
    y = np.full(100, 3e-15)
    y[10], y[20] = 3e-15 + 2e-14, 3e-15 - 2e-14
    result = screen(record_of(y), ScreeningRules(gross_bound=1e-14, outlier_threshold=None))
    assert result.flagged().tolist() == [10, 20]
    assert result.counts["out_of_bounds"] == 2
    assert result.running is None


def test_isolated_slips_of_whole_cycles_are_named(rng):
    y = rng.normal(0.0, 1e-16, 20_000)
    slips = np.arange(1_000, 20_000, 1_000)
    cycles = rng.choice([-3, -2, -1, 1, 2, 3], slips.size)
    y[slips] += cycles / SR_HZ
    y[500] += 0.5 / SR_HZ  # half a cycle: an outlier, no slip
    y[700:702] += 1.0 / SR_HZ  # two in a row are not isolated
    result = screen(record_of(y), carrier_hz=SR_HZ)
    assert np.all(result.reasons[slips] == Reason.CYCLE_SLIP)
    assert np.all(result.reasons[[500, 700, 701]] == Reason.OUTLIER)
    assert result.counts["cycle_slip"] == slips.size
    assert result.counts["outlier"] == 3


def test_without_a_carrier_a_slip_is_an_outlier(rng):
    y = rng.normal(0.0, 1e-16, 2_000)
    y[1_000] += 1.0 / SR_HZ
    assert screen(record_of(y)).reasons[1_000] == Reason.OUTLIER
    rules = ScreeningRules(cycle_slips=False)
    assert screen(record_of(y), rules, carrier_hz=SR_HZ).reasons[1_000] == Reason.OUTLIER


def test_noise_that_hides_the_integer_names_no_slip(rng):
    # 1 Hz of 429 THz is 2.3e-15; with a noise of 1e-15 an integer cannot be told.
    y = rng.normal(0.0, 1e-15, 20_000)
    y[1_000] += 5.0 / SR_HZ
    result = screen(record_of(y), carrier_hz=SR_HZ)
    assert result.reasons[1_000] == Reason.OUTLIER


def test_masks_apply_to_their_time_and_keep_author_and_reason():
    mask = Mask(
        start="2027-03-01T00:00:10Z", stop="2027-03-01T00:00:20Z", author="A. N.", reason="door"
    )
    result = screen(record_of(np.arange(100) * 1e-18), ScreeningRules(masks=(mask,)))
    np.testing.assert_array_equal(np.flatnonzero(result.reasons & Reason.MASKED), np.arange(10, 20))
    assert result.rules.masks[0].author == "A. N."


def test_a_mask_needs_an_author_a_reason_and_a_length():
    with pytest.raises(ValueError, match="must stop after its start"):
        Mask(start="2027-03-01T00:00:10", stop="2027-03-01T00:00:10", author="A", reason="b")
    with pytest.raises(ValueError, match="at least 1 character"):
        Mask(start="2027-03-01T00:00:10", stop="2027-03-01T00:00:20", author="", reason="b")


def test_reasons_add_up_and_nothing_is_deleted(rng):
    y = rng.normal(0.0, 1e-16, 1_000)
    y[100] += 1e-13
    y[200] = np.nan
    usable = np.isfinite(y)
    usable[300] = False
    mask = Mask(
        start=iso_utc(START + 100 * SECOND_NS),
        stop=iso_utc(START + 101 * SECOND_NS),
        author="A",
        reason="b",
    )
    rules = ScreeningRules(gross_bound=1e-14, masks=(mask,))
    record = record_of(y, usable=usable)
    result = screen(record, rules)
    assert result.reasons[100] == Reason.OUT_OF_BOUNDS | Reason.OUTLIER | Reason.MASKED
    assert Reason(int(result.reasons[100])).words == "out_of_bounds, outlier, masked"
    assert result.counts == {
        "not_usable": 2,
        "out_of_bounds": 1,
        "outlier": 1,
        "cycle_slip": 0,
        "masked": 1,
    }
    assert len(result.record) == 1_000
    np.testing.assert_array_equal(result.record.y, y)
    # Means by hand, with and without.
    assert result.mean_without == np.mean(y[usable])
    usable[100] = False
    assert result.mean_with == np.mean(y[usable])


def test_constant_data_have_no_outliers_and_say_so():
    y = np.full(1_000, 1e-16)
    y[500] = 2e-16
    result = screen(record_of(y))
    assert result.counts["outlier"] == 0
    assert "most values are equal" in result.notes[0]


def test_outliers_on_one_side_are_pointed_out(rng):
    y = rng.normal(0.0, 1e-16, 20_000)
    y[::1_000] += 2e-15
    assert any("on one side (20 above, 0 below)" in note for note in screen(record_of(y)).notes)


def test_a_record_of_one_row_is_screened():
    result = screen(record_of([1e-16]))
    assert result.valid.tolist() == [True]


@pytest.mark.parametrize("carrier", [0.0, -1.0, np.nan])
def test_a_carrier_must_be_positive(carrier):
    with pytest.raises(DataError, match="carrier must be positive"):
        screen(record_of([1e-16]), carrier_hz=carrier)


@pytest.mark.parametrize(
    "wrong",
    [{"outlier_threshold": 1.0}, {"window": 0.0}, {"gross_bound": -1.0}, {"slip_tolerance": 0.5}],
)
def test_rules_out_of_range_are_refused(wrong):
    with pytest.raises(ValueError, match=r"greater than|less than"):
        ScreeningRules(**wrong)


def test_the_running_median_is_the_median_of_its_blocks(rng):
    # Independent route: with equal blocks, numpy's own medians at the centres.
    y = rng.normal(0.0, 1.0, 1_000)
    running = running_median_and_spread(np.arange(1_000), y, width=101)
    blocks = y.reshape(10, 100)
    centres = np.arange(10) * 100 + 49.5
    at_centres = np.interp(centres, np.arange(1_000), running.median)
    np.testing.assert_allclose(at_centres, np.median(blocks, axis=1), atol=0.02)


def test_the_running_spread_follows_the_noise(rng):
    y = rng.normal(0.0, 1.0, 60_000)
    y[30_000:] *= 5.0
    running = running_median_and_spread(np.arange(60_000), y, width=300)
    # One block of 300 rows: 1.17/sqrt(300) = 6.8 %; the median of nine 1.25/3 of it, 2.8 %; four.
    assert np.all(np.abs(running.spread[:28_000] - 1.0) < 0.12)
    assert np.all(np.abs(running.spread[32_000:] - 5.0) < 0.60)
