"""Noise of a pair of clocks fitted to all its sessions by restricted maximum likelihood."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize, stats

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries, block_kernel, block_means, block_width
from clockgeo.frequency.noise import NoiseModel

__all__ = ["NoiseFit", "fit_noise"]

_BLOCKS = 320
_FEWEST_CONTRASTS = 12
_LAWS = ("flicker_fm", "random_walk_fm")


@dataclass(frozen=True)
class NoiseFit:
    """A fitted noise model and how far it can be trusted.

    Attributes
    ----------
    model : NoiseModel
        White FM, and flicker or random-walk FM if the data call for it.
    degrees_of_freedom : float
        Number of contrasts the fit rests on.
    information : dict of str to float
        Corrected Akaike criterion of each candidate, smaller is better: `white_fm` alone, and
        white with each of the slower laws.
    flicker_limit : float
        Upper end of the one-sided 95 % profile interval of the flicker floor (beside white noise).
    block_seconds : float
        Length of the blocks that were averaged first.
    """

    model: NoiseModel
    degrees_of_freedom: float
    information: dict[str, float]
    flicker_limit: float
    block_seconds: float


def fit_noise(series: Sequence[TickSeries], *, interval: float) -> NoiseFit:
    """Fit white and slower frequency noise to gapped sessions, each with a mean of its own.

    Parameters
    ----------
    series : sequence of TickSeries
        Sessions of one pair of clocks on one time line.
    interval : float
        Length of a tick in s.

    Returns
    -------
    NoiseFit

    Raises
    ------
    DataError
        If there are too few valid samples for a fit.

    Notes
    -----
    The sessions are first averaged over blocks long enough that neighbouring samples which a servo
    has correlated fall into one block. On contrasts of the block means (which see no session mean)
    the covariance is w D + s K, with D the white part and K the kernel of the slower law; one
    generalised eigen-decomposition makes both diagonal, so that the restricted likelihood
    (Patterson and Thompson 1971, Biometrika 58:545) is a sum of scalars. The candidate with the
    smallest corrected Akaike criterion wins.
    """
    blocks = _block_means(series, interval)
    contrasts = _session_contrasts(blocks, len(series))
    freedom = contrasts.shape[1]
    if freedom < _FEWEST_CONTRASTS:
        raise DataError(
            "too few valid samples to fit a noise model",
            value=f"{blocks.y.size} blocks in {len(series)} sessions",
            allowed=f"At least {_FEWEST_CONTRASTS} more blocks than sessions",
            advice="State the instability of clocks and links instead",
        )
    fits = {law: _two_laws(law, blocks, contrasts) for law in _LAWS}
    white_alone = fits["flicker_fm"].white_alone
    information = {"white_fm": white_alone.minus_two_log + _penalty(1, freedom)}
    for law, fit in fits.items():
        information[law] = fit.best.minus_two_log + _penalty(2, freedom)
    winner = min(information, key=lambda law: information[law])
    chosen = white_alone if winner == "white_fm" else fits[winner].best
    levels = {"white_fm": float(np.sqrt(chosen.white * interval))}
    if winner != "white_fm":
        levels[winner] = float(np.sqrt(chosen.slow))
    return NoiseFit(
        model=NoiseModel(**levels),
        degrees_of_freedom=float(freedom),
        information=information,
        flicker_limit=float(np.sqrt(fits["flicker_fm"].upper_slow)),
        block_seconds=blocks.width,
    )


@dataclass(frozen=True)
class _Levels:
    """White variance of one sample, slow level squared, and -2 log of the restricted likelihood."""

    white: float
    slow: float
    minus_two_log: float


@dataclass(frozen=True)
class _Fit:
    best: _Levels
    white_alone: _Levels
    upper_slow: float


@dataclass(frozen=True, eq=False)
class _Blocks:
    y: NDArray[np.float64]
    count: NDArray[np.float64]
    place: NDArray[np.int64]
    session: NDArray[np.int64]
    width: float


def _penalty(parameters: int, freedom: int) -> float:
    """Akaike's penalty with the correction for few data (Hurvich and Tsai 1989)."""
    k = parameters
    return 2.0 * k + 2.0 * k * (k + 1) / max(freedom - k - 1, 1)


def _two_laws(law: str, blocks: _Blocks, contrasts: NDArray[np.float64]) -> _Fit:
    """Fit white noise beside one slower law, and white noise alone."""
    span = float(blocks.place.max() + 1) * blocks.width
    kernel = block_kernel(NoiseModel(**{law: 1.0}), blocks.place, blocks.width, span)
    white = contrasts.T @ (contrasts / blocks.count[:, None])
    slow = contrasts.T @ kernel @ contrasts
    ratios, vectors = linalg.eigh(slow, white)
    squares = (vectors.T @ (contrasts.T @ blocks.y)) ** 2
    constant = float(np.linalg.slogdet(white)[1])
    freedom = squares.size

    def profiled(log_ratio: float) -> _Levels:
        """White level maximised for a given ratio of slow to white."""
        relative = 1.0 + np.exp(log_ratio) * np.maximum(ratios, 0.0)
        level = float(np.mean(squares / relative))
        loss = freedom * (np.log(level) + 1.0) + float(np.sum(np.log(relative))) + constant
        return _Levels(level, level * float(np.exp(log_ratio)), loss)

    alone = profiled(-np.inf)
    largest = float(np.max(ratios))
    grid = np.log(np.geomspace(1e-4, 1e6, 60) / largest)
    losses = [profiled(log).minus_two_log for log in grid]
    place = int(np.argmin(losses))
    bounds = grid[max(place - 1, 0)], grid[min(place + 1, grid.size - 1)]
    found = optimize.minimize_scalar(
        lambda log: profiled(log).minus_two_log, bounds=bounds, method="bounded"
    )
    best = profiled(float(found.x))
    best = best if best.minus_two_log < alone.minus_two_log else alone
    limit = best.minus_two_log + float(stats.chi2.ppf(0.90, 1))
    above = [log for log, loss in zip(grid, losses, strict=True) if loss <= limit]
    upper = profiled(max(above)).slow if above else best.slow
    return _Fit(best, alone, upper)


def _session_contrasts(blocks: _Blocks, sessions: int) -> NDArray[np.float64]:
    """Orthonormal contrasts within each session, shape (blocks, blocks - sessions)."""
    pieces = []
    for session in range(sessions):
        members = np.flatnonzero(blocks.session == session)
        if members.size > 1:
            piece = np.zeros((blocks.y.size, members.size - 1))
            piece[members] = linalg.null_space(np.ones((1, members.size)))
            pieces.append(piece)
    return np.hstack(pieces) if pieces else np.zeros((blocks.y.size, 0))


def _block_means(series: Sequence[TickSeries], interval: float) -> _Blocks:
    first = min(int(one.tick[0]) for one in series)
    width = block_width(series, _BLOCKS)
    averaged = [block_means(one, first=first, width=width) for one in series]
    owners = [np.full(blocks.place.size, owner) for owner, blocks in enumerate(averaged)]
    return _Blocks(
        np.concatenate([blocks.mean for blocks in averaged]),
        np.concatenate([blocks.count for blocks in averaged]),
        np.concatenate([blocks.place for blocks in averaged]),
        np.concatenate(owners),
        width * interval,
    )
