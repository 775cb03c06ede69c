"""Noise of a pair of clocks fitted to all its sessions by restricted maximum likelihood."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize, stats

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries, block_kernel
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.noise_doubt import reference_prior, schwarz_penalty, student_of_mixture
from clockgeo.frequency.session_blocks import (
    SessionBlocks,
    difference,
    mean_contrasts,
    session_blocks,
)

__all__ = ["NoiseFit", "fit_noise"]

_BLOCKS = 256
_FEWEST_CONTRASTS = 12
_SIGNIFICANT = 3.0
_LAWS = ("flicker_fm", "random_walk_fm")
_RATIOS = np.geomspace(3e-3, 1e6, 69)
"""Slow over white noise, in units of where the slow law begins to show; even in the logarithm."""
_NO_SLOW_NOISE = 0.3
"""Prior probability that there is none. By simulation of fifteen days, local - remote - local, this
share keeps intervals within a few per cent of their claim for white noise without a floor, with a
hidden one and with an open one; less makes them too long without, more too short with one."""


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
        Of the uncertainty of a difference of session means (of the halves of a single session).
    information : dict of str to float
        Schwarz's criterion of each candidate, smaller is better: `white_fm` alone, and white with
        each of the slower laws.
    flicker_limit : float
        Upper end of the one-sided 95 % profile interval of the flicker floor (beside white noise).
    block_seconds : float
        Length of the blocks that were averaged first.
    contrasts : int
        Contrasts between blocks that were fitted: the degrees of freedom of the white level of
        `model`, if no slow noise is hidden.
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
    contrasts: int
    u_drift: float | None = None


def fit_noise(
    series: Sequence[TickSeries], *, interval: float, means: Sequence[int] | None = None
) -> NoiseFit:
    """Fit white and slower frequency noise to gapped sessions whose means are unknown.

    Parameters
    ----------
    series : sequence of TickSeries, K items
        Sessions of one pair of clocks on one time line.
    interval : float
        Length of a tick in s.
    means : sequence of int, length K, optional
        Number of the mean that each session has, from 0. Sessions that measure the same thing may
        share one, and what they differ by then tells of the slow noise; each has its own if absent.

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
    level is integrated out with the prior 1/w and the ratio s/w with its reference prior beside a
    share for no slow noise at all, for the likelier slow law; where white noise alone is likeliest,
    a flicker floor that does not show may still be there. A random walk that does not show is left
    out: over the gaps between sessions it would be all prior and no data. What is left is a mixture
    of Student's t; the averaged levels and the degrees of freedom are those of the one Student's t
    with the same 68.3 % and 95 % intervals of a difference of means.
    """
    blocks = session_blocks(series, interval, blocks=_BLOCKS, means=means)
    contrasts = mean_contrasts(blocks)
    freedom = contrasts.shape[1]
    if freedom < _FEWEST_CONTRASTS:
        raise DataError(
            "too few valid samples to fit a noise model",
            value=f"{blocks.y.size} blocks in {len(series)} sessions",
            allowed=f"At least {_FEWEST_CONTRASTS} more blocks than sessions",
            advice="State the instability of clocks and links instead",
        )
    if _could_drift(blocks):
        # On contrasts that do not see a drift, which else would pass for slow noise.
        across = contrasts.T @ blocks.seconds
        blind = _fitted(blocks, contrasts @ linalg.null_space(across[None, :]), interval)
        drift, u = _drift(blocks, blind.averaged, interval)
        if abs(drift) > _SIGNIFICANT * u:
            model = blind.model.model_copy(update={"drift": drift})
            return replace(blind, model=model, u_drift=u)
    return _fitted(blocks, contrasts, interval)


def _fitted(blocks: SessionBlocks, contrasts: NDArray[np.float64], interval: float) -> NoiseFit:
    """Fit and average the laws on contrasts."""
    freedom = contrasts.shape[1]
    fits = {law: _two_laws(law, blocks, contrasts) for law in _LAWS}
    white_alone = fits["flicker_fm"].white_alone
    information = {"white_fm": white_alone.minus_two_log + schwarz_penalty(1, freedom)}
    for law, fit in fits.items():
        information[law] = fit.best.minus_two_log + schwarz_penalty(2, freedom)
    winner = min(information, key=lambda law: information[law])
    chosen = white_alone if winner == "white_fm" else fits[winner].best
    levels = {"white_fm": float(np.sqrt(chosen.white * interval))}
    if winner != "white_fm":
        levels[winner] = float(np.sqrt(chosen.slow))
    slow = winner if winner != "white_fm" else "flicker_fm"
    averaged, doubt = _average(slow, fits[slow], blocks, freedom)
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
        contrasts=freedom,
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
    ratios: NDArray[np.float64]
    grid: tuple[_Levels, ...]
    kernel: NDArray[np.float64]
    seen: NDArray[np.float64]
    """Variance of each eigencontrast under the slow law alone, in units of that of white noise."""


def _two_laws(law: str, blocks: SessionBlocks, contrasts: NDArray[np.float64]) -> _Fit:
    """Fit white noise beside one slower law, and white noise alone."""
    kernel = block_kernel(NoiseModel(**{law: 1.0}), blocks.place, blocks.width, blocks.span)
    white = contrasts.T @ (contrasts / blocks.count[:, None])
    slow = contrasts.T @ kernel @ contrasts
    seen, vectors = linalg.eigh(slow, white)
    seen = np.maximum(seen, 0.0)
    squares = (vectors.T @ (contrasts.T @ blocks.y)) ** 2
    constant = float(np.linalg.slogdet(white)[1])
    freedom = squares.size

    def profiled(ratio: float) -> _Levels:
        """White level maximised for a given ratio of slow to white."""
        relative = 1.0 + ratio * seen
        level = float(np.mean(squares / relative))
        loss = freedom * (np.log(level) + 1.0) + float(np.sum(np.log(relative))) + constant
        return _Levels(level, level * ratio, loss)

    alone = profiled(0.0)
    ratios = _RATIOS / float(seen.max())
    grid = [profiled(ratio) for ratio in ratios]
    place = int(np.argmin([levels.minus_two_log for levels in grid]))
    low, high = np.log(ratios[[max(place - 1, 0), min(place + 1, ratios.size - 1)]])
    found = optimize.minimize_scalar(
        lambda log: profiled(float(np.exp(log))).minus_two_log,
        bounds=(float(low), float(high)),
        method="bounded",
    )
    best = profiled(float(np.exp(found.x)))
    best = best if best.minus_two_log < alone.minus_two_log else alone
    limit = best.minus_two_log + float(stats.chi2.ppf(0.90, 1))
    allowed = [levels.slow for levels in grid if levels.minus_two_log <= limit]
    upper = max(allowed, default=best.slow)
    return _Fit(best, alone, upper, ratios, tuple(grid), kernel, seen)


def _average(
    law: str, fit: _Fit, blocks: SessionBlocks, freedom: int
) -> tuple[dict[str, float], float]:
    """Squared levels averaged over what the data allow, and the freedom that goes with them."""
    points = [*fit.grid, fit.white_alone]
    losses = np.array([levels.minus_two_log for levels in points])
    prior = (1.0 - _NO_SLOW_NOISE) * reference_prior(fit.ratios, fit.seen, freedom)
    weight = np.append(prior, _NO_SLOW_NOISE) * np.exp(-(losses - losses.min()) / 2.0)
    weight /= weight.sum()
    white = np.array([levels.white for levels in points])
    slow = np.array([levels.slow for levels in points])
    contrast = difference(blocks)
    variance = white * float(contrast**2 @ (1.0 / blocks.count))
    variance += slow * float(contrast @ fit.kernel @ contrast)
    scale, doubt = student_of_mixture(weight, np.sqrt(variance), freedom)
    factor = scale**2 / float(weight @ variance)
    return {
        "white_fm": float(weight @ white) * factor,
        law: float(weight @ slow) * factor,
    }, doubt


def _could_drift(blocks: SessionBlocks) -> bool:
    """Whether a drift stands out even if all noise were white, which is the least its u can be."""
    weight = np.sqrt(blocks.count)
    scale = float(np.ptp(blocks.seconds)) or 1.0
    design = np.column_stack([blocks.belongs, blocks.seconds / scale]) * weight[:, None]
    estimate, *_ = np.linalg.lstsq(design, blocks.y * weight, rcond=None)
    misfit = blocks.y * weight - design @ estimate
    freedom = max(blocks.y.size - design.shape[1], 1)
    cofactor = np.linalg.pinv(design.T @ design)[-1, -1]
    u = np.sqrt(float(misfit @ misfit) / freedom * cofactor)
    return bool(abs(estimate[-1]) > _SIGNIFICANT * u)


def _drift(blocks: SessionBlocks, noise: NoiseModel, interval: float) -> tuple[float, float]:
    """Common drift of all sessions beside their means, by generalised least squares; and its u."""
    covariance = block_kernel(noise, blocks.place, blocks.width, blocks.span)
    covariance += np.diag(noise.white_fm**2 / interval / blocks.count)
    scale = float(np.ptp(blocks.seconds)) or 1.0
    design = np.column_stack([blocks.belongs, blocks.seconds / scale])
    # The kernel is defined up to a constant, which the means of the sessions take up.
    factor = linalg.cho_factor(covariance + np.max(np.abs(covariance)) * np.ones_like(covariance))
    cofactor = linalg.inv(design.T @ linalg.cho_solve(factor, design))
    estimate = cofactor @ (design.T @ linalg.cho_solve(factor, blocks.y))
    return float(estimate[-1] / scale), float(np.sqrt(cofactor[-1, -1]) / scale)
