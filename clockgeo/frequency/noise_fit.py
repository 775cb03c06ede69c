"""Noise of a pair of clocks fitted to all its sessions by restricted maximum likelihood."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries, _kernel
from clockgeo.frequency.noise import NoiseModel

__all__ = ["NoiseFit", "fit_noise"]

_LARGEST = 320
_FEWEST = 12


@dataclass(frozen=True)
class NoiseFit:
    """A fitted model.

    Attributes
    ----------
    model : NoiseModel
    degrees_of_freedom : float
        Of the white level.
    """

    model: NoiseModel
    degrees_of_freedom: float


def fit_noise(series: Sequence[TickSeries], *, interval: float) -> NoiseFit:
    """Fit white, flicker and random-walk frequency noise to block means, each session its mean."""
    blocks = _block_means(series, interval)
    if blocks.y.size < _FEWEST:
        raise DataError(
            "too few valid samples to fit a noise model",
            value=f"{blocks.y.size} blocks",
            advice="State the instability of clocks and links in the document",
        )
    span = float(blocks.start.max() + blocks.width)
    white = 1.0 / blocks.count
    flicker = _kernel(NoiseModel(flicker_fm=1.0), blocks.start, blocks.width, span)
    walk = _kernel(NoiseModel(random_walk_fm=1.0), blocks.start, blocks.width, span)
    sessions = np.eye(len(series))[blocks.session]
    scale = float(np.var(blocks.y - sessions @ (sessions.T @ blocks.y / sessions.sum(0))))
    y = blocks.y / np.sqrt(scale)
    white_scale = float(np.mean(white))
    parts = [np.diag(white / white_scale), flicker, walk / span]

    def loss(logs: NDArray[np.float64]) -> float:
        covariance = sum(np.exp(log) * part for log, part in zip(logs, parts, strict=True))
        try:
            factor = linalg.cho_factor(covariance, lower=True)
        except linalg.LinAlgError:
            return 1e12
        inner = sessions.T @ linalg.cho_solve(factor, sessions)
        rest = linalg.cho_solve(factor, y)
        mean = linalg.solve(inner, sessions.T @ rest, assume_a="pos")
        quadratic = y @ rest - (sessions.T @ rest) @ mean
        return float(
            2 * np.sum(np.log(np.diag(factor[0]))) + np.linalg.slogdet(inner)[1] + quadratic
        )

    best = min(
        (
            optimize.minimize(
                loss, np.log([0.95, start, start]), method="Nelder-Mead",
                options={"xatol": 0.02, "fatol": 0.01, "maxiter": 250},
            )
            for start in (1e-1, 1e-3)
        ),
        key=lambda found: found.fun,
    )  # fmt: skip
    levels = np.exp(best.x) * scale
    samples_per_block_u = levels[0] / white_scale  # variance of a single sample
    return NoiseFit(
        NoiseModel(
            white_fm=float(np.sqrt(samples_per_block_u * interval)),
            flicker_fm=float(np.sqrt(levels[1])),
            random_walk_fm=float(np.sqrt(levels[2] / span)),
        ),
        float(y.size - len(series)),
    )


@dataclass(frozen=True, eq=False)
class _Blocks:
    y: NDArray[np.float64]
    count: NDArray[np.float64]
    start: NDArray[np.float64]
    session: NDArray[np.int64]
    width: float


def _block_means(series: Sequence[TickSeries], interval: float) -> _Blocks:
    first = min(int(one.tick[0]) for one in series)
    total = sum(one.tick.size for one in series)
    width = max(1, -(-total // _LARGEST))
    means, counts, starts, owners = [], [], [], []
    for place, one in enumerate(series):
        number = (one.tick - first) // width
        used, inverse, count = np.unique(number, return_inverse=True, return_counts=True)
        means.append(np.bincount(inverse, weights=one.y) / count)
        counts.append(count)
        starts.append(used * width * interval)
        owners.append(np.full(used.size, place))
    return _Blocks(
        np.concatenate(means),
        np.concatenate(counts).astype(np.float64),
        np.concatenate(starts).astype(np.float64),
        np.concatenate(owners),
        width * interval,
    )
