"""Equivalent degrees of freedom of windows on a record with gaps: tr(QC)²/tr(QCQC)."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.window_expectations import kernel_by_lag

__all__ = ["freedom_with_gaps"]

_STRETCH, _SHORTEST, _STRETCHES = 12, 256, 3
"""Stretches that stand for a long record: averaging times, ticks, and how many of them."""
_SHORT = 1_024
"""Ticks of a record whose every window is told of."""
_BLOCKS = 16
"""Blocks of an averaging time; windows are placed at every other of them."""


def freedom_with_gaps(
    count: NDArray[np.int32],
    m: int,
    levels: NDArray[np.float64],
    *,
    order: int,
    modified: bool,
    plain: bool,
    least: float,
    interval: float,
) -> float:
    """Freedom of the windows that are filled at least so well.

    Parameters
    ----------
    count : int32 array, shape (size + 1,)
        Running number of samples.
    m : int
        Averaging factor.
    levels : float array, shape (5,)
        Squared levels of the laws, see `LAWS`.
    order : int
        2 or 3.
    modified, plain : bool
        Windows weighted by triangles; windows that do not overlap.
    least : float
        Least filling, 0 to 1.
    interval : float
        Length of a tick in s.

    Returns
    -------
    float
        At least 1.

    Notes
    -----
    The whole quadratic form where the record holds few averaging times; else the forms of some
    stretches, scaled to the number of places for a window. Exact for records of up to 1024
    ticks; to some % elsewhere, where windows are placed at eighths of an averaging time.
    """
    size = count.size - 1
    short = size <= _SHORT
    width = 1 if short else max(1, m // _BLOCKS)
    each = max(round(m / width), 1)
    span = (3 if modified else order) * each
    blocks = max(size // width, 1)
    stretch = min(max(_STRETCH * each, _SHORTEST), blocks)
    step = each if plain else (1 if short else max(1, each // 8))
    if short or blocks <= 2 * stretch:
        stretch, starts = blocks, np.zeros(1, dtype=np.int64)
    else:
        starts = np.linspace(0, blocks - stretch, _STRETCHES).astype(np.int64)
    slow = _slow_covariance(levels, stretch, width * interval)
    found = []
    for first in starts:
        filling = np.diff(count[first * width : (first + stretch) * width + 1 : width])
        rows, firsts, weights = _contrasts(
            filling.astype(np.float64), each, step, order, modified, least * each * width
        )
        variance, shared = _fast_variance(levels, filling, width, interval)
        found.append(_freedom(rows, firsts, weights, slow, variance, shared))
    places = (blocks - span + 1) / max(stretch - span + 1, 1)
    return max(float(np.mean(found)) * places, 1.0)


@compiled
def _contrasts(
    filling: NDArray[np.float64], each: int, step: int, order: int, modified: bool, least: float
) -> tuple[NDArray[np.float64], NDArray[np.int64], NDArray[np.float64]]:
    """Weights of blocks in the windows that are filled, their first blocks, and their weights."""
    span = 3 * each - 1 if modified else order * each
    most = max((filling.size - span) // step + 1, 0)
    rows = np.zeros((most, span))
    firsts = np.empty(most, dtype=np.int64)
    weights = np.empty(most)
    number = 0
    parts = 2 if modified else order
    reach = 2 * each - 1 if modified else each
    for start in range(0, filling.size - span + 1, step):
        spread = 0.0
        rows[number, :] = 0.0
        for w in range(parts):
            n = 0.0
            for b in range(reach):
                share = (min(b + 1, reach - b) / each) if modified else 1.0
                n += share * filling[start + w * each + b]
            if n < least or n == 0.0:
                spread = 0.0
                break
            c = (-1.0 if w % 2 == 0 else 1.0) * (2.0 if order == 3 and w == 1 else 1.0)
            spread += c * c / n
            for b in range(reach):
                share = (min(b + 1, reach - b) / each) if modified else 1.0
                rows[number, w * each + b] += c * share * filling[start + w * each + b] / n
        if spread > 0.0:
            weights[number] = 1.0 / spread
            firsts[number] = start
            number += 1
    return rows[:number], firsts[:number], weights[:number]


@compiled
def _freedom(
    rows: NDArray[np.float64],
    firsts: NDArray[np.int64],
    weights: NDArray[np.float64],
    slow: NDArray[np.float64],
    variance: NDArray[np.float64],
    shared: NDArray[np.float64],
) -> float:
    """tr(QC)²/tr(QCQC) of windows of few blocks; 0 without windows.

    The covariance of blocks is `slow` by their distance, plus `variance` of each, plus `shared`
    with the next.
    """
    number, span = rows.shape
    first = 0.0
    second = 0.0
    product = np.empty(variance.size)
    for one in range(number):
        start = firsts[one]
        for block in range(start, variance.size):
            acc = 0.0
            for b in range(span):
                acc += rows[one, b] * slow[abs(block - start - b)]
            product[block] = acc
        for b in range(span):
            block = start + b
            product[block] += rows[one, b] * variance[block]
            if block + 1 < variance.size:
                product[block + 1] += rows[one, b] * shared[block]
            if b > 0:
                product[block - 1] += rows[one, b] * shared[block - 1]
        for other in range(one, number):
            acc = 0.0
            for b in range(span):
                acc += rows[other, b] * product[firsts[other] + b]
            if other == one:
                first += weights[one] * acc
                second += (weights[one] * acc) ** 2
            else:
                second += 2.0 * weights[one] * weights[other] * acc * acc
    return first * first / second if second > 0.0 else 0.0


def _slow_covariance(levels: NDArray[np.float64], blocks: int, width: float) -> NDArray[np.float64]:
    """Generalised covariance of means of blocks by their distance, flicker and random-walk FM."""
    model = NoiseModel(flicker_fm=float(levels[3]) ** 0.5, random_walk_fm=float(levels[4]) ** 0.5)
    return kernel_by_lag(model, blocks, width, blocks * width)


def _fast_variance(
    levels: NDArray[np.float64], filling: NDArray[np.int32], width: int, interval: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Variance of the mean of what each block holds, white FM and phase noise; with the next."""
    held = np.maximum(filling, 1).astype(np.float64)
    phase = float(levels[0] + levels[1]) * 2.0 / 3.0 / interval**2
    variance = float(levels[2]) / interval / held + phase / held**2
    # Neighbours without a gap between them share a phase.
    both = np.append((filling[1:] == width) & (filling[:-1] == width), False)
    return variance, np.where(both, -phase / 2.0 / width**2, 0.0)
