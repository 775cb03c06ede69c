"""Expectations and freedom of partly filled windows against dense covariance matrices.

The second route knows nothing of runs, edges or blocks: every window's weights are written out
sample by sample and put between covariance matrices of the samples, each from its own formula.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pytest

from checks import assert_close
from clockgeo.frequency.contrasts import LAWS, equivalent_freedom
from clockgeo.frequency.partial_windows import WindowExpectations
from clockgeo.frequency.stability_statistics import find_statistic
from clockgeo.frequency.window_freedom import freedom_with_gaps
from clockgeo.frequency.window_sums import runs_of

SIZE = 768
LEAST = 0.12


def seen(pattern):
    place = np.arange(SIZE)
    if pattern == "blocks":
        return place % 128 < 32
    if pattern == "random":
        return np.random.default_rng(5).random(SIZE) < 0.25
    return (place % 100 < 70) & (np.random.default_rng(6).random(SIZE) < 0.9)


PATTERNS = ("blocks", "random", "drop-outs")
STATISTICS = ("overlapping-allan", "modified-allan", "overlapping-hadamard", "allan")


@lru_cache
def covariance(law):
    """Generalised covariance of samples of unit Allan deviation at one tick (IEEE Std 1139)."""
    lag = np.abs(np.subtract.outer(np.arange(SIZE), np.arange(SIZE))).astype(float)
    if law == "white_pm":  # first differences of white phase of variance 1/3
        return np.where(lag == 0, 2.0, np.where(lag == 1, -1.0, 0.0)) / 3.0
    if law == "white_fm":
        return np.eye(SIZE)
    if law == "random_walk_fm":  # -π² h |t| with h of σ² = (2π²/3) τ h, averaged over both ticks
        inner = np.where(lag == 0, 1.0 / 3.0, lag)
        return -1.5 * inner
    if law == "flicker_fm":  # -h ln|t| with σ² = 2 ln 2 h, averaged: second difference of t² ln t/2
        table = np.arange(SIZE + 1.0)
        second = np.where(table > 0, table**2 / 2.0 * np.log(np.maximum(table, 1e-9)), 0.0)
        row = np.concatenate(([2.0 * second[1]], second[2:] - 2 * second[1:-1] + second[:-2]))
        return -row[lag.astype(int)] / (2.0 * np.log(2.0))
    # flicker PM: S_y = 4 sin²(π f) over 2 sin(π f), by a sum over midpoints.
    f = (np.arange(1 << 15) + 0.5) / (1 << 16)
    density = 2.0 * np.sin(np.pi * f)
    row = np.array([np.mean(density * np.cos(2 * np.pi * f * k)) for k in range(SIZE)])
    return (row / (row[0] - row[1]))[lag.astype(int)]


def windows(statistic, mask, m):
    """Weights of the samples in all windows that are filled, and the weights of their squares."""
    one = find_statistic(statistic)
    here = mask.astype(float)
    shapes, signs = [np.ones(m)] * one.order, [-1.0, 1.0] if one.order == 2 else [1.0, -2.0, 1.0]
    offsets = [m * k for k in range(one.order)]
    if one.kind == "modified":
        shapes, offsets = [np.convolve(np.ones(m), np.ones(m))] * 2, [0, m]
    reach = offsets[-1] + shapes[-1].size
    rows, weights = [], []
    for start in range(0, SIZE - reach + 1, m if one.kind == "plain" else max(m // 16, 1)):
        row, spread = np.zeros(SIZE), 0.0
        for shape, sign, offset in zip(shapes, signs, offsets, strict=True):
            part = slice(start + offset, start + offset + shape.size)
            held = shape * here[part]
            if held.sum() < max(LEAST * shape.sum(), 1.0):
                break
            row[part] += sign * held / held.sum()
            spread += sign**2 / held.sum()
        else:
            rows.append(row)
            weights.append(1.0 / spread)
    return np.array(rows), np.array(weights)


def expectations(statistic, mask):
    tick = np.flatnonzero(mask)
    count = np.concatenate(([0], np.cumsum(mask))).astype(np.int32)
    starts, stops = (ends + tick[0] for ends in runs_of(tick))
    return WindowExpectations(find_statistic(statistic), count, starts, stops, 1.0), count


@pytest.mark.parametrize("statistic", STATISTICS[:3])
@pytest.mark.parametrize("pattern", PATTERNS)
@pytest.mark.parametrize("m", [2, 16, 100])
def test_expectation_of_partly_filled_windows(statistic, pattern, m):
    mask = seen(pattern)
    rows, weights = windows(statistic, mask, m)
    found = expectations(statistic, mask)[0].partial(
        m, m if statistic == "allan" else max(m // 16, 1), LEAST
    )
    scale = 6.0 if "hadamard" in statistic else 2.0
    for law, value in zip(LAWS, found, strict=True):
        each = np.sum((rows @ covariance(law)) * rows, axis=1)
        exact = weights @ each / weights.sum() / scale
        # Blocks of a window and a choice of windows: 2 % in deviation is 4 % in variance.
        assert_close(value / exact, 1.0, tolerance=0.04, name=f"{law} at {m}")


@pytest.mark.parametrize("statistic", STATISTICS)
def test_complete_windows_have_the_published_expectation(statistic):
    # IEEE Std 1139: Allan variance of unit levels is 1/τ², 1/τ, 1, τ (white PM, white, flicker,
    # random-walk FM); modified 1/τ³ for white PM and, for many samples, 1/(2τ), 0.675, 0.824 τ.
    found = expectations(statistic, np.ones(SIZE, dtype=bool))[0]
    for m in (1, 64, 65_536):
        value = found.complete(m) * np.array([m**2, 1.0, m, 1.0, 1.0 / m])
        if "hadamard" in statistic:  # 10/18 and 1 of the Allan variance for the white laws
            assert_close(value[0], 20.0 / 18.0, tolerance=1e-9)
            assert_close(value[2], 1.0, tolerance=1e-9)
        elif statistic == "modified-allan" and m > 1:
            assert_close(value[0], 1.0 / m, tolerance=0.01 / m)
            np.testing.assert_allclose(value[2:], [0.5, 0.675, 0.824], rtol=0.01)
        else:
            np.testing.assert_allclose(value[[0, 2, 3, 4]], 1.0, rtol=0.01)


@pytest.mark.parametrize("statistic", STATISTICS[:3])
@pytest.mark.parametrize("pattern", PATTERNS)
@pytest.mark.parametrize("law", ["white_fm", "random_walk_fm"])
def test_freedom_of_partly_filled_windows(statistic, pattern, law):
    mask = seen(pattern)
    _, count = expectations(statistic, mask)
    for m in (1, 16, 100):
        rows, weights = windows(statistic, mask, m)
        found = freedom_with_gaps(
            count,
            m,
            np.array([float(law == one) for one in LAWS]),
            order=3 if "hadamard" in statistic else 2,
            modified=statistic == "modified-allan",
            plain=False,
            least=LEAST,
            interval=1.0,
        )
        exact = max(equivalent_freedom(rows, covariance(law), weights), 1.0)
        # Up to this length every window is told of; partly filled ones are placed at sixteenths of
        # an averaging time here, which costs a few per cent.
        assert_close(found / exact, 1.0, tolerance=0.05, name=f"{law} at {m}")
