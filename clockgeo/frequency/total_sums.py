"""Compiled sums of squares over records and segments that are extended by reflection."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled

__all__ = ["odd_reflection_squares", "segment_squares"]


@compiled
def odd_reflection_squares(phase: NDArray[np.float64], m: int) -> float:
    """Sum of squared second differences at every inner point of phase reflected at both ends.

    Parameters
    ----------
    phase : float array, shape (N,)
        Beyond an end e it continues as 2 x(e) - x(e - n), so that first differences stay.
    m : int
        Distance of the differences, 1 to N - 1.
    """
    last = phase.size - 1
    squares = 0.0
    for n in range(1, last):
        early = phase[n - m] if n >= m else 2.0 * phase[0] - phase[m - n]
        late = phase[n + m] if n + m <= last else 2.0 * phase[last] - phase[2 * last - n - m]
        d = early - 2.0 * phase[n] + late
        squares += d * d
    return squares


@compiled
def segment_squares(values: NDArray[np.float64], m: int, stride: int) -> tuple[float, int]:
    """Mean squared second difference of m-averages in segments of 3m values, summed over them.

    Parameters
    ----------
    values : float array, shape (N,)
        Phase or frequency. From each segment the slope between the means of its halves is taken
        off (the middle point left out where 3m is odd), and both ends are reflected without a flip.
    m : int
        Averaging factor, at most N/3.
    stride : int
        Every so many-th segment counts.

    Returns
    -------
    squares : float
        Sum over the segments of the mean of 6m squared differences.
    segments : int
        Their number.
    """
    size = 3 * m
    half = size // 2
    longer = np.empty(3 * size + 1)
    longer[size] = 0.0
    total = 0.0
    segments = 0
    for start in range(0, values.size - size + 1, stride):
        base = values[start]
        early = 0.0
        late = 0.0
        for i in range(half):
            early += values[start + i] - base
            late += values[start + size - half + i] - base
        slope = (late - early) / half / (size - half)
        # Running sum over the mirror image, the segment and its other mirror image.
        acc = 0.0
        for i in range(size):
            acc += values[start + i] - base - slope * i
            longer[size + i + 1] = acc
        for j in range(size):
            longer[j] = -longer[2 * size - j]
            longer[3 * size - j] = 2.0 * acc - longer[size + j]
        squares = 0.0
        for k in range(6 * m):
            d = longer[k + 3 * m] - 3.0 * (longer[k + 2 * m] - longer[k + m]) - longer[k]
            squares += d * d
        total += squares / (6.0 * m) / m**2
        segments += 1
    return total, segments
