"""Compiled expectations of squared contrasts of partly filled windows under five power laws.

White FM follows from the numbers of samples, flicker and random-walk FM from the filling of blocks
of a window, and phase noise from the edges of its runs of samples: between two edges a sum of y is
a difference of phase. Everything is exact for windows of up to `BLOCKS` samples.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled
from clockgeo.frequency.mean import block_kernel
from clockgeo.frequency.noise import NoiseModel

__all__ = [
    "BLOCKS",
    "expected_modified",
    "expected_squares",
    "flicker_phase_structure",
    "kernel_by_lag",
]

BLOCKS = 32
"""Blocks of a window within which its filling is told."""
_EDGES = 640
"""Most edges of a window that are told apart; where there are more, the first of them stand for all
in each of many windows."""
_FIRST = 160
_NEIGHBOURS = 24
"""Edges on one side that are told to an edge; signs alternate, so that the rest cancels."""
_ALL = 128
"""Number of edges up to which all are told to each other."""
_DENSE = 800
"""Longest reach of two triangles in samples for which every phase counts as an edge."""


def kernel_by_lag(model: NoiseModel, blocks: int, width: float, span: float) -> NDArray[np.float64]:
    """First row of `block_kernel`: blocks by their distance, shape (blocks,)."""
    places = np.arange(blocks, dtype=np.int64)
    return np.asarray(block_kernel(model, places, width, span)[0])


@compiled
def flicker_phase_structure(lag: int) -> float:
    """E (x(t + lag) - x(t))² of flicker phase noise with unit Allan deviation at one tick.

    3/4 Σ 1/(2j - 1), j = 1 to lag: the integral of 4 sin²(π f lag)/(2 sin π f) over 0 to 1/2.
    """
    if lag > 20:
        return 0.75 * (0.5 * math.log(lag) + 0.9817550087 + 1.0 / (48.0 * lag * lag))
    acc = 0.0
    for j in range(1, lag + 1):
        acc += 1.0 / (2.0 * j - 1.0)
    return 0.75 * acc


_STRUCTURE = np.array([flicker_phase_structure(lag) for lag in range(1_024)])


@compiled
def _of_edges(
    place: NDArray[np.int64], size: NDArray[np.float64], number: int, reach: int
) -> tuple[float, float]:
    """Variance of Σ size x(place) for white and flicker phase; sizes add up to zero.

    Of flicker phase each edge is told to so many others on one side.
    """
    white = 0.0
    flicker = 0.0
    for k in range(number):
        white += size[k] * size[k]
        last = min(number, k + reach + 1)
        for other in range(k + 1, last):
            share = 0.5 if (other == k + reach and reach < number) else 1.0
            lag = place[other] - place[k]
            s = _STRUCTURE[lag] if lag < 1_024 else flicker_phase_structure(lag)
            flicker -= share * size[k] * size[other] * s
    return white / 3.0, flicker


@compiled
def expected_squares(
    count: NDArray[np.int32],
    starts: NDArray[np.int64],
    stops: NDArray[np.int64],
    probes: NDArray[np.int64],
    m: int,
    order: int,
    least: float,
    flicker: NDArray[np.float64],
    walk: NDArray[np.float64],
) -> tuple[float, NDArray[np.float64]]:
    """Weights and weighted expectations of the squares that `partial_squares` adds up.

    Parameters
    ----------
    count : int32 array
        Running number of samples.
    starts, stops : int64 arrays
        Runs without a gap.
    probes : int64 array
        Where windows begin that shall be looked at.
    m, order : int
    least : float
    flicker, walk : float arrays, shape (order min(m, 32),)
        Generalised covariance of the means of blocks of m/min(m, 32) ticks, by their distance.

    Returns
    -------
    weights : float
    expected : float array, shape (5,)
        White PM, flicker PM, white FM, flicker FM and random-walk FM of unit level per tick.
    """
    weights = 0.0
    expected = np.zeros(5)
    blocks = min(m, BLOCKS)
    filling = np.empty(order * blocks)
    place = np.empty(_EDGES + 4, dtype=np.int64)
    size = np.empty(_EDGES + 4)
    factor = np.empty(order)
    for i in probes:
        enough = True
        spread = 0.0
        for w in range(order):
            n = float(count[i + (w + 1) * m] - count[i + w * m])
            if n < least:
                enough = False
                break
            sign = -1.0 if w % 2 == 0 else 1.0
            c = sign * (2.0 if order == 3 and w == 1 else 1.0)
            factor[w] = c / n
            spread += c * c / n
            for b in range(blocks):
                low, high = i + w * m + b * m // blocks, i + w * m + (b + 1) * m // blocks
                filling[w * blocks + b] = factor[w] * float(count[high] - count[low])
        if not enough:
            continue
        slow = 0.0
        walks = 0.0
        for one in range(order * blocks):
            slow += filling[one] * filling[one] * flicker[0]
            walks += filling[one] * filling[one] * walk[0]
            for other in range(one):
                product = 2.0 * filling[one] * filling[other]
                slow += product * flicker[one - other]
                walks += product * walk[one - other]
        number = 0
        edges = 0.0
        run = np.searchsorted(stops, i, side="right")
        end = i + order * m
        while run < starts.size and starts[run] < end:
            for w in range(order):
                low = max(starts[run], i + w * m)
                high = min(stops[run], i + (w + 1) * m)
                if high <= low:
                    continue
                edges += 2.0 * factor[w] * factor[w]
                if number >= _EDGES:
                    continue
                if number and place[number - 1] == low:
                    size[number - 1] -= factor[w]
                else:
                    place[number] = low
                    size[number] = -factor[w]
                    number += 1
                place[number] = high
                size[number] = factor[w]
                number += 1
            run += 1
        crowded = number >= _EDGES
        number = min(number, _FIRST) if crowded else number
        white, phase = _of_edges(place, size, number, number if number <= _ALL else _NEIGHBOURS)
        if crowded:
            told = 0.0
            for k in range(number):
                told += size[k] * size[k]
            white, phase = white * edges / told, phase * edges / told
        weights += 1.0 / spread
        expected[0] += white / spread
        expected[1] += phase / spread
        expected[2] += 1.0
        expected[3] += slow / spread
        expected[4] += walks / spread
    return weights, expected


@compiled
def _triangles(place: float, m: int, n1: float, n2: float) -> float:
    """Weight of the sample at a place in the contrast of two triangles, n1 and n2 their sums."""
    first = min(place + 1.0, 2.0 * m - 1.0 - place)
    second = min(place - m + 1.0, 3.0 * m - 1.0 - place)
    return max(second, 0.0) / n2 - max(first, 0.0) / n1


@compiled
def expected_modified(
    count: NDArray[np.int32],
    starts: NDArray[np.int64],
    stops: NDArray[np.int64],
    probes: NDArray[np.int64],
    m: int,
    least: float,
    flicker: NDArray[np.float64],
    walk: NDArray[np.float64],
    whole: NDArray[np.float64],
) -> tuple[float, NDArray[np.float64]]:
    """As `expected_squares`, of the squares that `partial_modified` adds up.

    Parameters
    ----------
    whole : float array, shape (2,)
        Expectations of a complete contrast under white and flicker PM, which the slopes of the
        triangles make; the edges of gaps come on top.
    """
    weights = 0.0
    expected = np.zeros(5)
    blocks = min(m, BLOCKS)
    filling = np.empty(3 * blocks)
    shape = np.empty(3 * blocks)
    place = np.empty(_DENSE + _EDGES, dtype=np.int64)
    size = np.empty(_DENSE + _EDGES)
    dense = 3 * m <= _DENSE
    for i in probes:
        n1 = 0.0
        n2 = 0.0
        for b in range(3 * blocks):
            low, high = b * m // blocks, (b + 1) * m // blocks
            held = float(count[min(i + high, count.size - 1)] - count[i + low])
            middle = (low + high - 1) / 2.0
            filling[b] = held
            shape[b] = middle
            n1 += held * max(min(middle + 1.0, 2.0 * m - 1.0 - middle), 0.0)
            n2 += held * max(min(middle - m + 1.0, 3.0 * m - 1.0 - middle), 0.0)
        if n1 < least or n2 < least:
            continue
        independent = 0.0
        for b in range(3 * blocks):
            g = _triangles(shape[b], m, n1, n2)
            independent += filling[b] * g * g
            filling[b] *= g
        slow = 0.0
        walks = 0.0
        for one in range(3 * blocks):
            slow += filling[one] * filling[one] * flicker[0]
            walks += filling[one] * filling[one] * walk[0]
            for other in range(one):
                product = 2.0 * filling[one] * filling[other]
                slow += product * flicker[one - other]
                walks += product * walk[one - other]
        number = 0
        total_edges = 0
        run = np.searchsorted(stops, i, side="right")
        end = i + 3 * m - 1
        while run < starts.size and starts[run] < end:
            low, high = max(starts[run], i), min(stops[run], end)
            run += 1
            total_edges += 2
            if number >= _EDGES and not dense:
                continue
            before = 0.0
            if dense:
                for t in range(low, high):
                    g = _triangles(float(t - i), m, n1, n2)
                    place[number], size[number] = t, before - g
                    number += 1
                    before = g
            else:
                place[number], size[number] = low, -_triangles(float(low - i), m, n1, n2)
                number += 1
                before = _triangles(float(high - 1 - i), m, n1, n2)
            place[number], size[number] = high, before
            number += 1
        number = min(number, _FIRST) if number >= _EDGES and not dense else number
        reach = number if dense or number <= _ALL else _NEIGHBOURS
        white, phase = _of_edges(place, size, number, reach)
        if not dense:
            share = total_edges / number
            slopes = float(m) ** 4 * 0.5 * (1.0 / n1**2 + 1.0 / n2**2)
            white = white * share + whole[0] * slopes
            phase = phase * share + whole[1] * slopes
        spread = 1.0 / n1 + 1.0 / n2
        weights += 1.0 / spread
        expected[0] += white / spread
        expected[1] += phase / spread
        expected[2] += independent / spread
        expected[3] += slow / spread
        expected[4] += walks / spread
    return weights, expected
