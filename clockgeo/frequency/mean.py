"""Means of gapped records under power-law noise, and their covariance on the real time line."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.noise import NoiseModel

__all__ = [
    "Blocks",
    "TickSeries",
    "block_kernel",
    "block_means",
    "block_width",
    "mean_covariance",
]

_BLOCKS = 1500
_NEAR = 100.0
"""Lag beyond which the series in 1/lag is exact to 1e-11."""
_LONGEST_TABLE = 2_000_000


@dataclass(frozen=True, eq=False)
class TickSeries:
    """Valid samples on an integer time line.

    Attributes
    ----------
    tick : int64 array, shape (N,)
        Positions, strictly increasing.
    y : float array, shape (N,)
        Fractional frequency, finite.
    """

    tick: NDArray[np.int64]
    y: NDArray[np.float64]


def mean_covariance(
    model: NoiseModel,
    series: Sequence[TickSeries],
    *,
    interval: float,
    span: float | None = None,
) -> NDArray[np.float64]:
    """Covariance of the plain means of several gapped series of one oscillator or pair.

    Series may overlap; what they have in common is then the same noise. For white FM the
    correlation is T_overlap/√(T1 T2).

    Notes
    -----
    Flicker and random-walk frequency noise leave the level of a mean undefined; only contrasts
    have a variance. The additive constant of each is chosen so that the mean over the whole `span`
    has the Allan variance at the span.
    """
    first = min(int(one.tick[0]) for one in series)
    last = max(int(one.tick[-1]) for one in series)
    if span is None:
        span = (last - first + 1) * interval
    counts = np.array([one.tick.size for one in series], dtype=np.float64)
    covariance = _white_part(model, series, counts * interval, interval)
    if model.white_pm or model.flicker_pm:
        runs = np.array([1 + np.count_nonzero(np.diff(one.tick) > 1) for one in series])
        variance = (model.white_pm**2 + model.flicker_pm**2) / 3.0
        covariance += np.diag(2.0 * runs * variance / (counts * interval) ** 2)
    if model.h_minus1 or model.h_minus2:
        weights, places, width = _shares(series, first)
        kernel = block_kernel(model, places, width * interval, span)
        covariance += weights @ kernel @ weights.T
    return covariance


def _white_part(
    model: NoiseModel, series: Sequence[TickSeries], seconds: NDArray[np.float64], interval: float
) -> NDArray[np.float64]:
    """White FM of means over `seconds` of valid time each, and of what they have in common."""
    covariance = np.diag(model.h0 / (2.0 * seconds))
    if model.h0:
        for i, j in combinations(range(len(series)), 2):
            common = _common_ticks(series[i].tick, series[j].tick) * interval
            covariance[i, j] = covariance[j, i] = (
                model.h0 / 2.0 * common / (seconds[i] * seconds[j])
            )
    return covariance


def _common_ticks(first: NDArray[np.int64], second: NDArray[np.int64]) -> int:
    if first[-1] < second[0] or second[-1] < first[0]:
        return 0
    return int(np.intersect1d(first, second, assume_unique=True).size)


@dataclass(frozen=True, eq=False)
class Blocks:
    """Means of the samples of one series in blocks of equal width.

    Attributes
    ----------
    place : int64 array, shape (B,)
        Occupied blocks, increasing, in units of the width.
    mean, count : float array, shape (B,)
        Mean and number of the samples in each.
    """

    place: NDArray[np.int64]
    mean: NDArray[np.float64]
    count: NDArray[np.float64]


def block_means(one: TickSeries, *, first: int, width: int) -> Blocks:
    """Average a series over blocks of `width` ticks that start at the tick `first`."""
    number = (one.tick - first) // width
    edges = np.flatnonzero(np.diff(number)) + 1
    starts = np.concatenate(([0], edges))
    count = np.diff(np.concatenate((starts, [number.size]))).astype(np.float64)
    return Blocks(number[starts], np.add.reduceat(one.y, starts) / count, count)


def block_width(series: Sequence[TickSeries], blocks: int) -> int:
    """Ticks of a block so that all series together have about `blocks` of them."""
    total = sum(int(one.tick[-1] - one.tick[0]) + 1 for one in series)
    return max(1, -(-total // blocks))


def _shares(
    series: Sequence[TickSeries], first: int
) -> tuple[NDArray[np.float64], NDArray[np.int64], int]:
    """Share of each series in each occupied block of equal width, and the blocks' places."""
    width = block_width(series, _BLOCKS)
    averaged = [block_means(one, first=first, width=width) for one in series]
    occupied = np.unique(np.concatenate([blocks.place for blocks in averaged]))
    weights = np.zeros((len(series), occupied.size))
    for row, blocks in enumerate(averaged):
        weights[row, np.searchsorted(occupied, blocks.place)] = blocks.count / blocks.count.sum()
    return weights, occupied, width


def block_kernel(
    model: NoiseModel, places: NDArray[np.int64], width: float, span: float
) -> NDArray[np.float64]:
    """Covariance of the means of equal blocks under flicker and random-walk frequency noise.

    Parameters
    ----------
    model : NoiseModel
        Only `flicker_fm` and `random_walk_fm` count.
    places : int64 array, shape (B,)
        Places of the blocks on the time line, in units of `width`.
    width : float
        Length of a block in s.
    span : float
        Length in s that fixes the additive constant; contrasts do not depend on it.

    Returns
    -------
    float array, shape (B, B)

    Notes
    -----
    The generalised covariance is -h-1 ln(t) for flicker and -π² h-2 t for random-walk noise; block
    means see its average over a triangle of base 2 `width`, from the second antiderivative, or
    from the series in width/t where that would lose digits. Blocks on one grid share few lags.
    """
    lags = np.abs(places[:, None] - places[None, :])
    longest = int(lags.max())
    if longest > _LONGEST_TABLE:
        return _kernel_at(model, lags.astype(np.float64), width, span)
    return np.asarray(_kernel_at(model, np.arange(longest + 1.0), width, span)[lags])


def _kernel_at(
    model: NoiseModel, lag: NDArray[np.float64], width: float, span: float
) -> NDArray[np.float64]:
    """Kernel at lags in units of the width; see `block_kernel`."""
    near = np.minimum(lag, _NEAR)
    log_far = np.log(np.maximum(lag, 1.0)) - np.divide(1.0, 12.0 * np.maximum(lag, 1.0) ** 2)
    logs = np.where(lag > _NEAR, log_far, _second_difference(near, _flicker_second))
    linear = np.where(lag > 0.0, lag, 1.0 / 3.0)
    flicker = model.h_minus1 * (2.0 * np.log(2.0) - 1.5 - np.log(width / span) - logs)
    walk = model.h_minus2 * np.pi**2 * (span - width * linear)
    return np.asarray(flicker + walk)


def _flicker_second(x: NDArray[np.float64]) -> NDArray[np.float64]:
    """Second antiderivative of ln|x|."""
    size = np.maximum(np.abs(x), 1e-300)
    return np.asarray(size**2 * (np.log(size) / 2.0 - 0.75))


def _second_difference(
    x: NDArray[np.float64], f: Callable[[NDArray[np.float64]], NDArray[np.float64]]
) -> NDArray[np.float64]:
    return f(x + 1.0) + f(x - 1.0) - 2.0 * f(x)
