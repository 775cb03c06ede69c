"""Equivalent degrees of freedom of windows on a record with gaps: tr(QC)²/tr(QCQC)."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.compiling import compiled
from clockgeo.frequency.contrasts import equivalent_freedom
from clockgeo.frequency.mean import block_kernel
from clockgeo.frequency.noise import NoiseModel

__all__ = ["freedom_with_gaps"]

_STRETCH, _SHORTEST, _STRETCHES = 24, 256, 4
"""Stretches that stand for a long record: averaging times, ticks, and how many of them."""
_BLOCKS = 16
"""Blocks of an averaging time; windows are placed at every fourth of them."""


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
    stretches, scaled to the number of places for a window. Exact for m up to 4, and to about 2 %
    above, where windows are placed at quarters of an averaging time.
    """
    size = count.size - 1
    width = max(1, m // _BLOCKS)
    each = max(round(m / width), 1)
    span = (3 if modified else order) * each
    step = each if plain else max(1, each // 4)
    blocks = max(size // width, 1)
    stretch = min(max(_STRETCH * each, _SHORTEST), blocks)
    if blocks <= 2 * stretch:
        stretch, starts = blocks, np.zeros(1, dtype=np.int64)
    else:
        starts = np.linspace(0, blocks - stretch, _STRETCHES).astype(np.int64)
    covariances = _slow_covariance(levels, stretch, width * interval)
    found = []
    for first in starts:
        filling = np.diff(count[first * width : (first + stretch) * width + 1 : width])
        rows, weights = _contrasts(
            filling.astype(np.float64), each, step, order, modified, least * each * width
        )
        if weights.size:
            covariance = covariances + _fast_covariance(levels, filling, width, interval)
            found.append(equivalent_freedom(rows, covariance, weights))
        else:
            found.append(0.0)
    places = (blocks - span + 1) / max(stretch - span + 1, 1)
    return max(float(np.mean(found)) * places, 1.0)


@compiled
def _contrasts(
    filling: NDArray[np.float64], each: int, step: int, order: int, modified: bool, least: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Weights of blocks in the contrasts of all windows that are filled, and weights of these."""
    span = 3 * each - 1 if modified else order * each
    most = max((filling.size - span) // step + 1, 0)
    rows = np.zeros((most, filling.size))
    weights = np.empty(most)
    number = 0
    parts = 2 if modified else order
    for start in range(0, filling.size - span + 1, step):
        spread = 0.0
        enough = True
        for w in range(parts):
            n = 0.0
            reach = 2 * each - 1 if modified else each
            for b in range(reach):
                share = (min(b + 1, reach - b) / each) if modified else 1.0
                n += share * filling[start + w * each + b]
            if n < least or n == 0.0:
                enough = False
                break
            c = (-1.0 if w % 2 == 0 else 1.0) * (2.0 if order == 3 and w == 1 else 1.0)
            spread += c * c / n
            for b in range(reach):
                share = (min(b + 1, reach - b) / each) if modified else 1.0
                rows[number, start + w * each + b] += c * share * filling[start + w * each + b] / n
        if enough:
            weights[number] = 1.0 / spread
            number += 1
        else:
            rows[number, :] = 0.0
    return rows[:number], weights[:number]


def _slow_covariance(levels: NDArray[np.float64], blocks: int, width: float) -> NDArray[np.float64]:
    """Generalised covariance of the means of blocks under flicker and random-walk FM."""
    model = NoiseModel(flicker_fm=float(levels[3]) ** 0.5, random_walk_fm=float(levels[4]) ** 0.5)
    return block_kernel(model, np.arange(blocks, dtype=np.int64), width, blocks * width)


def _fast_covariance(
    levels: NDArray[np.float64], filling: NDArray[np.int32], width: int, interval: float
) -> NDArray[np.float64]:
    """Covariance of the means of what blocks hold under white FM and phase noise."""
    held = np.maximum(filling, 1).astype(np.float64)
    phase = float(levels[0] + levels[1]) * 2.0 / 3.0 / interval**2
    covariance = np.diag(float(levels[2]) / interval / held + phase / held**2)
    if phase:
        # Neighbours without a gap between them share a phase.
        both = (filling[1:] == width) & (filling[:-1] == width)
        shared = np.where(both, -phase / 2.0 / width**2, 0.0)
        covariance += np.diag(shared, 1) + np.diag(shared, -1)
    return covariance
