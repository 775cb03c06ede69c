"""Compiled sums over windows of a record, with or without gaps.

All work on running sums of y (which stand still where there is no sample) and of the number of
samples, so that one pass over memory serves any averaging time. Complete windows are looked for
within runs of samples without a gap; partly filled ones anywhere, at least so well filled.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled

__all__ = [
    "complete_modified",
    "complete_squares",
    "partial_modified",
    "partial_squares",
    "running_sums",
    "runs_of",
]


@compiled
def running_sums(
    tick: NDArray[np.int64], y: NDArray[np.float64], size: int, mean: float
) -> tuple[NDArray[np.float64], NDArray[np.int32]]:
    """Running sums of y - mean and of the samples on a line of `size` ticks, shapes (size + 1,)."""
    total = np.empty(size + 1)
    count = np.empty(size + 1, dtype=np.int32)
    acc = 0.0
    row = 0
    for place in range(tick.size):
        here = tick[place] - tick[0]
        while row <= here:
            total[row] = acc
            count[row] = place
            row += 1
        acc += y[place] - mean
    while row <= size:
        total[row] = acc
        count[row] = tick.size
        row += 1
    return total, count


@compiled
def runs_of(tick: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """First tick of each run without a gap, and the one behind its last, from the first sample."""
    number = 1
    for place in range(1, tick.size):
        if tick[place] != tick[place - 1] + 1:
            number += 1
    starts = np.empty(number, dtype=np.int64)
    stops = np.empty(number, dtype=np.int64)
    starts[0] = 0
    run = 0
    for place in range(1, tick.size):
        if tick[place] != tick[place - 1] + 1:
            stops[run] = tick[place - 1] + 1 - tick[0]
            run += 1
            starts[run] = tick[place] - tick[0]
    stops[run] = tick[-1] + 1 - tick[0]
    return starts, stops


@compiled
def _squares(total: NDArray[np.float64], m: int, order: int, stride: int) -> float:
    """Sum over all places within one run; without a stride, loops over whole vectors."""
    places = total.size - order * m
    acc = 0.0
    if order == 2 and stride == 1:
        early, middle, late = total[:places], total[m : m + places], total[2 * m :]
        for i in range(places):
            d = late[i] - 2.0 * middle[i] + early[i]
            acc += d * d
    elif order == 2:
        for i in range(0, places, stride):
            d = total[i + 2 * m] - 2.0 * total[i + m] + total[i]
            acc += d * d
    else:
        for i in range(0, places, stride):
            d = total[i + 3 * m] - 3.0 * (total[i + 2 * m] - total[i + m]) - total[i]
            acc += d * d
    return acc


@compiled
def complete_squares(
    total: NDArray[np.float64],
    starts: NDArray[np.int64],
    stops: NDArray[np.int64],
    m: int,
    order: int,
    stride: int,
) -> tuple[float, int]:
    """Sum of squared differences of sums of m samples, of order 1 or 2 (`order` 2 or 3).

    Returns
    -------
    squares : float
        In units of y² m².
    number : int
        Windows that were found.
    """
    squares = 0.0
    number = 0
    for run in range(starts.size):
        first = (starts[run] + stride - 1) // stride * stride
        behind = stops[run] - order * m + 1
        if behind <= first:
            continue
        squares += _squares(total[first : behind + order * m], m, order, stride)
        number += (behind - first + stride - 1) // stride
    return squares, number


@compiled
def complete_modified(
    total: NDArray[np.float64], starts: NDArray[np.int64], stops: NDArray[np.int64], m: int
) -> tuple[float, int]:
    """As `complete_squares`, of sums of m neighbouring second differences; in units of y² m⁴."""
    squares = 0.0
    number = 0
    for run in range(starts.size):
        first = starts[run]
        places = stops[run] - first - 3 * m + 2
        if places <= 0:
            continue
        acc = 0.0
        for j in range(first, first + m):
            acc += total[j + 2 * m] - 2.0 * total[j + m] + total[j]
        squares += acc * acc
        for i in range(first, first + places - 1):
            acc += total[i + 3 * m] - 3.0 * (total[i + 2 * m] - total[i + m]) - total[i]
            squares += acc * acc
        number += places
    return squares, number


@compiled
def partial_squares(
    total: NDArray[np.float64],
    count: NDArray[np.int32],
    m: int,
    order: int,
    stride: int,
    least: float,
) -> tuple[float, float, int]:
    """Weighted sum of squared differences of means of partly filled windows.

    Parameters
    ----------
    total, count : arrays, shape (size + 1,)
        Of `running_sums`.
    m, order, stride : int
    least : float
        Samples that each window must hold.

    Returns
    -------
    squares, weights : float
        The weight 1/(1/n1 + 1/n2), or 1/(1/n1 + 4/n2 + 1/n3), is inverse to the white variance.
    number : int
    """
    squares = 0.0
    weights = 0.0
    number = 0
    for i in range(0, total.size - order * m, stride):
        n1 = float(count[i + m] - count[i])
        n2 = float(count[i + 2 * m] - count[i + m])
        if n1 < least or n2 < least:
            continue
        first = (total[i + m] - total[i]) / n1
        second = (total[i + 2 * m] - total[i + m]) / n2
        d = second - first
        spread = 1.0 / n1 + 1.0 / n2
        if order == 3:
            n3 = float(count[i + 3 * m] - count[i + 2 * m])
            if n3 < least:
                continue
            d = (total[i + 3 * m] - total[i + 2 * m]) / n3 - second - d
            spread += 3.0 / n2 + 1.0 / n3
        squares += d * d / spread
        weights += 1.0 / spread
        number += 1
    return squares, weights, number


@compiled
def _strided_modified(
    total: NDArray[np.float64], count: NDArray[np.int32], m: int, stride: int, least: float
) -> tuple[float, float, int]:
    """`partial_modified` where the stride divides m: from sums at its multiples, in one pass."""
    blocks = total.size // stride
    sums = np.zeros(blocks + 1)
    held = np.zeros(blocks + 1)
    for k in range(blocks):
        acc = 0.0
        number = 0.0
        for j in range(k * stride, (k + 1) * stride):
            acc += total[j]
            number += count[j]
        sums[k + 1] = sums[k] + acc
        held[k + 1] = held[k] + number
    each = m // stride
    squares = 0.0
    weights = 0.0
    found = 0
    for k in range(blocks - 3 * each + 1):
        n1 = held[k + 2 * each] - 2.0 * held[k + each] + held[k]
        n2 = held[k + 3 * each] - 2.0 * held[k + 2 * each] + held[k + each]
        if n1 < least or n2 < least:
            continue
        first = sums[k + 2 * each] - 2.0 * sums[k + each] + sums[k]
        second = sums[k + 3 * each] - 2.0 * sums[k + 2 * each] + sums[k + each]
        d = second / n2 - first / n1
        spread = 1.0 / n1 + 1.0 / n2
        squares += d * d / spread
        weights += 1.0 / spread
        found += 1
    return squares, weights, found


@compiled
def partial_modified(
    total: NDArray[np.float64], count: NDArray[np.int32], m: int, stride: int, least: float
) -> tuple[float, float, int]:
    """As `partial_squares`, of differences of means weighted by triangles of base 2m.

    `least` is a sum of weights: m² for a complete triangle.
    """
    if stride > 1 and m % stride == 0:
        return _strided_modified(total, count, m, stride, least)
    squares = 0.0
    weights = 0.0
    number = 0
    places = total.size - 3 * m + 1
    # Sums of m neighbouring running sums, at distances of m.
    a, b, c = 0.0, 0.0, 0.0
    p = np.int64(0)
    q = np.int64(0)
    r = np.int64(0)
    for j in range(m if places > 0 else 0):
        a += total[j]
        b += total[j + m]
        c += total[j + 2 * m]
        p += np.int64(count[j])
        q += np.int64(count[j + m])
        r += np.int64(count[j + 2 * m])
    for i in range(places):
        if i % stride == 0:
            n1 = float(q - p)
            n2 = float(r - q)
            if n1 >= least and n2 >= least:
                d = (c - b) / n2 - (b - a) / n1
                spread = 1.0 / n1 + 1.0 / n2
                squares += d * d / spread
                weights += 1.0 / spread
                number += 1
        if i + 1 < places:
            a += total[i + m] - total[i]
            b += total[i + 2 * m] - total[i + m]
            c += total[i + 3 * m] - total[i + 2 * m]
            p += np.int64(count[i + m]) - np.int64(count[i])
            q += np.int64(count[i + 2 * m]) - np.int64(count[i + m])
            r += np.int64(count[i + 3 * m]) - np.int64(count[i + 2 * m])
    return squares, weights, number
