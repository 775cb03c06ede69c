"""Data that lie, by truth: interpolated rows, servo noise and steps are found, clean ones not."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.signal import lfilter

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.frequency import Record, diagnose
from clockgeo.frequency.neighbours import (
    Interpolation,
    correlation_of_neighbours,
    interpolation_correlation,
)
from clockgeo.times import SECOND_NS


def record_of(y, kept=None):
    tick = np.arange(y.size) if kept is None else np.flatnonzero(kept)
    y = np.asarray(y)[tick]
    return Record("lab", 2_000_000_000 * SECOND_NS + tick * SECOND_NS, y, np.isfinite(y), 1.0, tick)


def interpolated(rng, count, cycle, *, phase=0.3):
    """Independent values every `cycle` s, interpolated linearly onto whole seconds."""
    knots = rng.normal(0.0, 1e-16, int(count / cycle) + 3)
    return np.interp(np.arange(count), np.arange(knots.size) * cycle + phase, knots)


# 1.9 s cycles on a 1 s grid: the true u is 1.69 times the naive one; sqrt(1.5 Tc/tau0).
def test_the_factor_of_interpolated_rows():
    assert_published(Interpolation(1.9).factor, "1.69")


@pytest.mark.parametrize("cycle", [1.3, 1.9, 2.5])
def test_the_factor_is_that_of_simulated_means(rng, cycle):
    # By truth: scatter of means of interpolated rows over their mean naive u.
    means, naive = [], []
    for _ in range(400):
        y = interpolated(rng, 400, cycle, phase=float(rng.uniform(0.0, cycle)))
        means.append(y.mean())
        naive.append(y.std(ddof=1) / 20.0)
    ratio = np.std(means) / np.mean(naive)
    # The scatter of 400 means is known to 1/sqrt(800) = 3.5 %; three of these.
    assert_close(ratio / Interpolation(cycle).factor, 1.0, tolerance=0.11)


@pytest.mark.parametrize("h", [0.0, 0.25, 0.5, 1.0, 1.5, 1.9, 2.0, 3.0])
def test_the_correlation_is_the_triangle_convolved_with_itself(h):
    # Independent route: numerical convolution of the kernel of linear interpolation.
    def kernel(t):
        return max(0.0, 1.0 - abs(t))

    corners = [-1.0, 0.0, 1.0, h - 1.0, h, h + 1.0]
    value = quad(lambda t: kernel(t) * kernel(t - h), -3.0, 4.0, points=corners, limit=200)[0]
    at_zero = 2.0 / 3.0
    formula = float(interpolation_correlation(np.array([1.9 * h]), 1.9)[0])
    assert_close(formula, value / at_zero, tolerance=1e-9)


@pytest.mark.parametrize("cycle", [1.5, 1.9, 2.0, 2.3, 3.0])
@pytest.mark.parametrize("uptime", [1.0, 0.8])
def test_interpolated_rows_are_recognised_with_their_cycle(rng, cycle, uptime):
    kept = rng.random(20_000) < uptime
    findings = diagnose(record_of(interpolated(rng, 20_000, cycle), kept))
    assert [finding.kind for finding in findings] == ["interpolated"]
    # The line of 20 000 s fixes the cycle to about cycle^2/20 000.
    assert_close(findings[0].period, cycle, tolerance=cycle**2 / 10_000)
    assert_close(findings[0].factor, np.sqrt(1.5 * cycle), tolerance=1e-3)
    assert "times too small" in findings[0].words


def test_filtered_noise_is_correlated_but_not_interpolated(rng):
    for coefficients in ([0.5, 0.5], [0.25, 0.5, 0.25], [0.1, 0.4, 0.4, 0.1]):
        y = lfilter(coefficients, [1.0], rng.normal(0.0, 1e-16, 20_000))
        findings = diagnose(record_of(y))
        assert [finding.kind for finding in findings] == ["correlated"]
        # Identity: a filter of unit gain leaves the mean alone and lowers s by its norm.
        expected = 1.0 / np.sqrt(np.sum(np.square(coefficients)))
        # Sixty lags of 20 000 rows: sqrt(242/20 000)/2 = 5.5 %; three of these.
        assert_close(findings[0].factor / expected, 1.0, tolerance=0.165)


def test_a_servo_is_pointed_out_with_its_period(rng):
    decay, turn = 0.9, 2.0 * np.pi / 20.0
    drive = rng.normal(0.0, 1e-17, 30_000)
    y = lfilter([1.0], [1.0, -2.0 * decay * np.cos(turn), decay**2], drive)
    found = {finding.kind: finding for finding in diagnose(record_of(y))}
    assert set(found) == {"correlated", "oscillation"}
    assert_close(found["oscillation"].period, 20.0, tolerance=3.0)


def test_clean_records_have_no_findings(rng):
    found = 0
    for _ in range(60):
        kept = np.ones(4_000, dtype=bool)
        for start in rng.integers(0, 3_900, 6):
            kept[start : start + 60] = False
        found += len(diagnose(record_of(rng.normal(0.0, 1e-16, 4_000), kept)))
    # Steps may be reported in 1 % of records: more than 4 in 60 has a chance of 5e-4.
    assert found <= 4


@pytest.mark.parametrize("noise", ["white", "correlated"])
def test_a_step_across_a_gap_is_found_with_epoch_and_size(rng, noise):
    y = rng.normal(0.0, 1e-16, 6_000)
    if noise == "correlated":
        y = lfilter([0.3], [1.0, -0.7], y)
    y[3_100:] += 1e-16
    kept = np.ones(6_000, dtype=bool)
    kept[3_000:3_100] = False
    kept[4_500:4_600] = False
    record = record_of(y, kept)
    steps = [finding for finding in diagnose(record) if finding.kind == "step"]
    assert [step.tai_ns for step in steps] == [int(record.tai_ns[3_000])]
    # 300 rows on either side: four standard uncertainties.
    assert_close(steps[0].size, 1e-16, tolerance=4.0 * steps[0].u)
    assert 0.5e-17 < steps[0].u < 2e-17


def test_steps_without_a_gap_are_left_to_the_noise_model(rng):
    y = np.cumsum(rng.normal(0.0, 1e-18, 5_000)) + rng.normal(0.0, 1e-16, 5_000)
    assert not [finding for finding in diagnose(record_of(y)) if finding.kind == "step"]


def test_correlation_respects_gaps(rng):
    # Identity: leaving rows out at random changes no expectation.
    y = lfilter([0.5, 0.5], [1.0], rng.normal(0.0, 1.0, 200_000))
    kept = np.flatnonzero(rng.random(200_000) < 0.3)
    neighbours = correlation_of_neighbours(kept, y[kept])
    # Products of rows 18 000 pairs apart: 1/sqrt(18 000) = 0.0075; four of these.
    assert_close(neighbours.correlation[1], 0.5, tolerance=0.03)
    assert_close(neighbours.correlation[2], 0.0, tolerance=0.03)


def test_few_rows_tell_nothing(rng):
    assert diagnose(record_of(rng.normal(0.0, 1e-16, 2))) == ()
    assert diagnose(record_of(interpolated(rng, 400, 1.9))) == ()


def test_constant_data_tell_nothing():
    assert diagnose(record_of(np.full(1_000, 1e-16))) == ()


def test_rows_without_a_value_cannot_be_valid(rng):
    y = rng.normal(0.0, 1e-16, 100)
    y[3] = np.nan
    with pytest.raises(DataError, match="must be usable rows"):
        diagnose(record_of(y), valid=np.ones(100, dtype=bool))
    with pytest.raises(DataError, match="must be usable rows"):
        diagnose(record_of(y), valid=np.ones(99, dtype=bool))
