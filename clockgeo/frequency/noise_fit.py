"""Noise of a pair of clocks fitted to all its sessions by restricted maximum likelihood."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize, stats

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries, block_kernel, block_means, block_width
from clockgeo.frequency.noise import NoiseModel

__all__ = ["NoiseFit", "fit_noise"]

_BLOCKS = 256
_FEWEST_CONTRASTS = 12
_SIGNIFICANT = 3.0
_LAWS = ("flicker_fm", "random_walk_fm")
_RATIOS = np.geomspace(3e-3, 1e6, 69)
"""Slow over white noise, in units of where the slow law begins to show; even in the logarithm."""


@dataclass(frozen=True)
class NoiseFit:
    """A fitted noise model and how far it can be trusted.

    Attributes
    ----------
    model : NoiseModel
        The likeliest: white FM, and flicker or random-walk FM if the data call for it.
    averaged : NoiseModel
        Squared levels averaged over all models the data allow, each by its probability; the one to
        take uncertainties from, because a floor that does not show may still be there. Scaled for
        intervals by Student's t with `degrees_of_freedom`.
    degrees_of_freedom : float
        How well the variance of a difference of session means (of the halves of a single session)
        is known: that of a chi-squared with the same relative spread.
    information : dict of str to float
        Corrected Akaike criterion of each candidate, smaller is better: `white_fm` alone, and
        white with each of the slower laws.
    flicker_limit : float
        Upper end of the one-sided 95 % profile interval of the flicker floor (beside white noise).
    block_seconds : float
        Length of the blocks that were averaged first.
    u_drift : float or None
        Standard uncertainty of the model's linear drift in 1/s under the averaged noise; the model
        holds a drift only where it is beyond three times that.
    """

    model: NoiseModel
    averaged: NoiseModel
    degrees_of_freedom: float
    information: dict[str, float]
    flicker_limit: float
    block_seconds: float
    u_drift: float | None = None


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
    (Patterson and Thompson 1971, Biometrika 58:545) is a sum of scalars. For the average, the white
    level is integrated out with the prior 1/w and the ratio s/w is summed over an even grid in its
    logarithm, from nothing to everything, for the likelier slow law; where white noise alone is
    likeliest, a flicker floor that does not show may still be there. A random walk that does not
    show is left out: over the gaps between sessions it would be all prior and no data.
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
    if _could_drift(blocks, len(series)):
        # On contrasts that do not see a drift, which else would pass for slow noise.
        across = contrasts.T @ blocks.seconds
        blind = _fitted(blocks, contrasts @ linalg.null_space(across[None, :]), interval)
        drift, u = _drift(blocks, len(series), blind.averaged, interval)
        if abs(drift) > _SIGNIFICANT * u:
            model = blind.model.model_copy(update={"drift": drift})
            return replace(blind, model=model, u_drift=u)
    return _fitted(blocks, contrasts, interval)


def _fitted(blocks: _Blocks, contrasts: NDArray[np.float64], interval: float) -> NoiseFit:
    """Fit and average the laws on contrasts."""
    freedom = contrasts.shape[1]
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
    slow = winner if winner != "white_fm" else "flicker_fm"
    averaged, doubt = _average({slow: fits[slow]}, blocks, freedom)
    return NoiseFit(
        model=NoiseModel(**levels),
        averaged=NoiseModel(
            white_fm=float(np.sqrt(averaged["white_fm"] * interval)),
            **{slow: float(np.sqrt(averaged[slow]))},
        ),
        degrees_of_freedom=doubt,
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


@dataclass(frozen=True, eq=False)
class _Fit:
    """White noise beside one slow law, and the kernel of that law between blocks."""

    best: _Levels
    white_alone: _Levels
    upper_slow: float
    grid: tuple[_Levels, ...]
    kernel: NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class _Blocks:
    y: NDArray[np.float64]
    count: NDArray[np.float64]
    place: NDArray[np.int64]
    session: NDArray[np.int64]
    width: float

    @property
    def seconds(self) -> NDArray[np.float64]:
        """Middle of each block, from the first one."""
        return np.asarray((self.place - self.place[0]) * self.width, dtype=np.float64)


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
    ratios = np.maximum(ratios, 0.0)
    squares = (vectors.T @ (contrasts.T @ blocks.y)) ** 2
    constant = float(np.linalg.slogdet(white)[1])
    freedom = squares.size

    def profiled(ratio: float) -> _Levels:
        """White level maximised for a given ratio of slow to white."""
        relative = 1.0 + ratio * ratios
        level = float(np.mean(squares / relative))
        loss = freedom * (np.log(level) + 1.0) + float(np.sum(np.log(relative))) + constant
        return _Levels(level, level * ratio, loss)

    alone = profiled(0.0)
    grid = [profiled(ratio) for ratio in _RATIOS / float(ratios.max())]
    place = int(np.argmin([levels.minus_two_log for levels in grid]))
    around = np.log(_RATIOS[[max(place - 1, 0), min(place + 1, _RATIOS.size - 1)]] / ratios.max())
    found = optimize.minimize_scalar(
        lambda log: profiled(float(np.exp(log))).minus_two_log, bounds=around, method="bounded"
    )
    best = profiled(float(np.exp(found.x)))
    best = best if best.minus_two_log < alone.minus_two_log else alone
    limit = best.minus_two_log + float(stats.chi2.ppf(0.90, 1))
    allowed = [levels.slow for levels in grid if levels.minus_two_log <= limit]
    return _Fit(best, alone, max(allowed, default=best.slow), tuple(grid), kernel)


def _average(
    fits: dict[str, _Fit], blocks: _Blocks, freedom: int
) -> tuple[dict[str, float], float]:
    """Squared levels averaged over models, and the freedom of the variance of a difference."""
    points = [(law, levels) for law, fit in fits.items() for levels in fit.grid]
    losses = np.array([levels.minus_two_log for _, levels in points])
    weight = np.exp(-(losses - losses.min()) / 2.0)
    weight /= weight.sum()
    # The white level is an inverse gamma variable given the ratio: mean and variance are known.
    mean = freedom / max(freedom - 2.0, 1.0)
    spread = 2.0 / max(freedom - 4.0, 1.0)
    white = np.array([levels.white for _, levels in points]) * mean
    slow = np.array([levels.slow for _, levels in points]) * mean
    averaged = {"white_fm": float(weight @ white)}
    contrast = _difference(blocks)
    variance = white * float(contrast**2 @ (1.0 / blocks.count))
    for law, fit in fits.items():
        of_law = np.array([name == law for name, _ in points])
        averaged[law] = float(weight[of_law] @ slow[of_law])
        variance[of_law] += slow[of_law] * float(contrast @ fit.kernel @ contrast)
    total = float(weight @ variance)
    relative = float(weight @ variance**2) * (1.0 + spread) / total**2 - 1.0
    doubt = min(2.0 / max(relative, 1e-12) + 4.0, float(freedom))
    # The mean of an inverse gamma variable is larger than the scale of Student's t by ν/(ν - 2).
    return {law: level * (doubt - 2.0) / doubt for law, level in averaged.items()}, doubt


def _difference(blocks: _Blocks) -> NDArray[np.float64]:
    """Weights of the difference that stands for all: later sessions, or half, minus the first."""
    sessions = np.unique(blocks.session)
    if sessions.size > 1:
        early = blocks.session == sessions[0]
    else:
        early = np.arange(blocks.y.size) < blocks.y.size // 2
    share = np.where(early, -blocks.count, 0.0) / blocks.count[early].sum()
    late = ~early
    return np.asarray(share + np.where(late, blocks.count, 0.0) / blocks.count[late].sum())


def _could_drift(blocks: _Blocks, sessions: int) -> bool:
    """Whether a drift stands out even if all noise were white, which is the least its u can be."""
    means = (blocks.session[:, None] == np.arange(sessions)).astype(np.float64)
    weight = np.sqrt(blocks.count)
    scale = float(np.ptp(blocks.seconds)) or 1.0
    design = np.column_stack([means, blocks.seconds / scale]) * weight[:, None]
    estimate, *_ = np.linalg.lstsq(design, blocks.y * weight, rcond=None)
    misfit = blocks.y * weight - design @ estimate
    freedom = max(blocks.y.size - design.shape[1], 1)
    cofactor = np.linalg.pinv(design.T @ design)[-1, -1]
    u = np.sqrt(float(misfit @ misfit) / freedom * cofactor)
    return bool(abs(estimate[-1]) > _SIGNIFICANT * u)


def _drift(
    blocks: _Blocks, sessions: int, noise: NoiseModel, interval: float
) -> tuple[float, float]:
    """Common drift of all sessions beside their means, by generalised least squares; and its u."""
    span = float(blocks.place.max() + 1) * blocks.width
    covariance = block_kernel(noise, blocks.place, blocks.width, span)
    covariance += np.diag(noise.white_fm**2 / interval / blocks.count)
    means = (blocks.session[:, None] == np.arange(sessions)).astype(np.float64)
    scale = float(np.ptp(blocks.seconds)) or 1.0
    design = np.column_stack([means, blocks.seconds / scale])
    # The kernel is defined up to a constant, which the means of the sessions take up.
    factor = linalg.cho_factor(covariance + np.max(np.abs(covariance)) * np.ones_like(covariance))
    cofactor = linalg.inv(design.T @ linalg.cho_solve(factor, design))
    estimate = cofactor @ (design.T @ linalg.cho_solve(factor, blocks.y))
    return float(estimate[-1] / scale), float(np.sqrt(cofactor[-1, -1]) / scale)


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
