"""Compiled sums over windows of a record, with or without gaps.

All work on running sums of y (zero where there is no sample) and of the number of samples, so that
one pass over memory serves any averaging time. A window counts if it holds at least `least`
samples; with `least` = m only complete windows do.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled

__all__ = ["running_sums", "second_sums", "three_windows", "two_windows", "window_pairs"]


@compiled
def running_sums(
    tick: NDArray[np.int64], y: NDArray[np.float64], size: int, mean: float
) -> tuple[NDArray[np.float64], NDArray[np.int32]]:
    """Running sums of y - mean and of the samples on a line of `size` ticks, shapes (size + 1,)."""
    total = np.zeros(size + 1)
    count = np.zeros(size + 1, dtype=np.int32)
    place = 0
    number = np.int32(0)
    acc = 0.0
    for row in range(size):
        if place < tick.size and tick[place] == row:
            acc += y[place] - mean
            number += np.int32(1)
            place += 1
        total[row + 1] = acc
        count[row + 1] = number
    return total, count


@compiled
def two_windows(total: NDArray[np.float64], m: int, stride: int) -> tuple[float, int]:
    """Sum of squared differences of neighbouring complete averages, and their number."""
    acc = 0.0
    places = total.size - 2 * m
    scale = 1.0 / m
    number = 0
    for i in range(0, places, stride):
        d = (total[i + 2 * m] - 2.0 * total[i + m] + total[i]) * scale
        acc += d * d
        number += 1
    return acc, number


@compiled
def window_pairs(
    total: NDArray[np.float64],
    count: NDArray[np.int32] | NDArray[np.float64],
    m: int,
    stride: int,
    least: float,
) -> tuple[float, float, int]:
    """Weighted sum of squared differences of neighbouring averages, sum of weights, number.

    The weight n1 n2/(n1 + n2) is the inverse of the white variance of the difference.
    """
    acc = 0.0
    weights = 0.0
    number = 0
    for i in range(0, total.size - 2 * m, stride):
        first = float(count[i + m] - count[i])
        second = float(count[i + 2 * m] - count[i + m])
        if first >= least and second >= least:
            d = (total[i + 2 * m] - total[i + m]) / second - (total[i + m] - total[i]) / first
            w = first * second / (first + second)
            acc += w * d * d
            weights += w
            number += 1
    return acc, weights, number


@compiled
def three_windows(
    total: NDArray[np.float64],
    count: NDArray[np.int32] | NDArray[np.float64],
    m: int,
    stride: int,
    least: float,
) -> tuple[float, float, int]:
    """As `window_pairs`, for second differences of three neighbouring averages."""
    acc = 0.0
    weights = 0.0
    number = 0
    for i in range(0, total.size - 3 * m, stride):
        first = float(count[i + m] - count[i])
        second = float(count[i + 2 * m] - count[i + m])
        third = float(count[i + 3 * m] - count[i + 2 * m])
        if first >= least and second >= least and third >= least:
            d = (
                (total[i + 3 * m] - total[i + 2 * m]) / third
                - 2.0 * (total[i + 2 * m] - total[i + m]) / second
                + (total[i + m] - total[i]) / first
            )
            w = 1.0 / (1.0 / first + 4.0 / second + 1.0 / third)
            acc += w * d * d
            weights += w
            number += 1
    return acc, weights, number


@compiled
def second_sums(
    total: NDArray[np.float64], count: NDArray[np.int32], m: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Running sums of windows of m samples: their differences weight samples by a triangle."""
    size = total.size - m
    sums = np.zeros(size + 1)
    counts = np.zeros(size + 1)
    for i in range(size):
        sums[i + 1] = sums[i] + (total[i + m] - total[i])
        counts[i + 1] = counts[i] + float(count[i + m] - count[i])
    return sums, counts
