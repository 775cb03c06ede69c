"""Means of gapped records under power-law noise, and their covariance on the real time line."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.noise import NoiseModel

__all__ = ["TickSeries", "block_kernel", "mean_covariance"]

_BLOCKS = 1500


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
    """Covariance of the plain means of several gapped series of one oscillator pair.

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
    covariance = np.diag(model.h0 / (2.0 * counts * interval))
    if model.white_pm or model.flicker_pm:
        runs = np.array([1 + np.count_nonzero(np.diff(one.tick) > 1) for one in series])
        variance = (model.white_pm**2 + model.flicker_pm**2) / 3.0
        covariance += np.diag(2.0 * runs * variance / (counts * interval) ** 2)
    if model.h_minus1 or model.h_minus2:
        weights, starts, width = _blocks(series, first, last)
        kernel = block_kernel(model, starts * interval, width * interval, span)
        covariance += weights @ kernel @ weights.T
    return covariance


def _blocks(
    series: Sequence[TickSeries], first: int, last: int
) -> tuple[NDArray[np.float64], NDArray[np.float64], float]:
    """Share of each series in each occupied block of equal width."""
    total = sum(int(one.tick[-1] - one.tick[0]) + 1 for one in series)
    width = max(1, -(-total // _BLOCKS))
    numbers = [(one.tick - first) // width for one in series]
    occupied = np.unique(np.concatenate([np.unique(n) for n in numbers]))
    weights = np.zeros((len(series), occupied.size))
    for row, number in enumerate(numbers):
        used, counts = np.unique(number, return_counts=True)
        weights[row, np.searchsorted(occupied, used)] = counts / number.size
    return weights, occupied * float(width), float(width)


def block_kernel(
    model: NoiseModel, starts: NDArray[np.float64], width: float, span: float
) -> NDArray[np.float64]:
    """Covariance of block means from the second antiderivative of the generalised covariance."""
    t = np.abs(starts[:, None] - starts[None, :])

    def second(x: NDArray[np.float64]) -> NDArray[np.float64]:
        size = np.maximum(np.abs(x), 1e-12) / span
        flicker = -model.h_minus1 * span**2 * (size**2 / 2.0 * np.log(size) - 0.75 * size**2)
        return np.asarray(flicker - model.h_minus2 * np.pi**2 * (size * span) ** 3 / 6.0)

    # the kernel is -h |..|; P is its second antiderivative, so the window formula gives + signs
    mean = (second(t + width) + second(t - width) - 2.0 * second(t)) / width**2
    flicker_constant = model.h_minus1 * (2.0 * np.log(2.0) - 1.5)
    walk_constant = model.h_minus2 * np.pi**2 * span
    return np.asarray(mean + flicker_constant + walk_constant)
