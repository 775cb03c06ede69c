"""Covariances of samples, and of means of blocks, under each of the five power laws.

Each is for a level of one: an Allan variance of 1 at 1 s, or a floor of 1. White FM is exact,
phase noise follows from its structure function at the edges of samples, and the two slow laws are
generalised covariances, defined up to what contrasts do not see.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.mean import block_kernel
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.window_expectations import flicker_phase_structure

__all__ = ["LAWS", "of_blocks", "of_samples"]

LAWS = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm")
_SLOW = LAWS[3:]


def of_samples(tick: NDArray[np.int64], interval: float) -> dict[str, NDArray[np.float64]]:
    """Covariances of single samples.

    Parameters
    ----------
    tick : int64 array, shape (n,)
        Their places, increasing.
    interval : float
        Length of a tick in s.

    Returns
    -------
    dict of str to float array, shape (n, n)
        Law -> covariance of y, fractional squared.
    """
    span = float(tick[-1] - tick[0] + 1) * interval
    return {
        **_phase(tick, tick + 1, interval),
        "white_fm": np.eye(tick.size) / interval,
        **{law: block_kernel(NoiseModel(**{law: 1.0}), tick, interval, span) for law in _SLOW},
    }


def of_blocks(
    place: NDArray[np.int64],
    count: NDArray[np.float64],
    edges: tuple[NDArray[np.int64], NDArray[np.int64]],
    runs: NDArray[np.float64],
    *,
    width: float,
    interval: float,
) -> dict[str, NDArray[np.float64]]:
    """Covariances of means of blocks.

    Parameters
    ----------
    place : int64 array, shape (B,)
        Places of the blocks in units of their width.
    count, runs : float array, shape (B,)
        Samples of each block, and unbroken runs they form.
    edges : two int64 arrays, shape (B,)
        First tick of each block, and the one after its last. Phase noise is exact for blocks
        without gaps; at the ends of further runs it counts as if it were white.
    width, interval : float
        Length of a block and of a tick in s.
    """
    span = float(place.max() + 1) * width
    phase = _phase(*edges, interval)
    shrink = (edges[1] - edges[0]) / count
    for law in phase:
        phase[law] = phase[law] * np.outer(shrink, shrink)
        # A mean of one more run is a difference of two more phases, of variance 1/3 each.
        phase[law] += np.diag(2.0 * (runs - 1.0) / 3.0 / (count * interval) ** 2)
    return {
        **phase,
        "white_fm": np.diag(1.0 / (count * interval)),
        **{law: block_kernel(NoiseModel(**{law: 1.0}), place, width, span) for law in _SLOW},
    }


def _phase(
    start: NDArray[np.int64], stop: NDArray[np.int64], interval: float
) -> dict[str, NDArray[np.float64]]:
    """Covariances of unbroken means from `start` to `stop`: differences of phase over time.

    Half of S(b - a') + S(a - b') - S(a - a') - S(b - b') with S the mean square of the phase's
    change over a lag.
    """
    length = (stop - start) * interval
    lags = [
        np.abs(one[:, None] - other[None, :]) for one in (start, stop) for other in (start, stop)
    ]
    found = {}
    for law, structure in (("white_pm", _white_structure), ("flicker_pm", _flicker_structure)):
        starts, across, back, stops = (structure(lag) for lag in lags)
        found[law] = (across + back - starts - stops) / 2.0 / np.outer(length, length)
    return found


def _white_structure(lag: NDArray[np.int64]) -> NDArray[np.float64]:
    return np.where(lag > 0, 2.0 / 3.0, 0.0)


def _flicker_structure(lag: NDArray[np.int64]) -> NDArray[np.float64]:
    every, where = np.unique(lag, return_inverse=True)
    values = np.array([flicker_phase_structure(int(one)) for one in every])
    return np.asarray(values[where].reshape(lag.shape))
