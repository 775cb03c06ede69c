"""All five power laws of a record at once: from single samples to its whole length.

Long averages tell of the slow laws, neighbouring samples of phase noise. The record is therefore
cut into blocks; means of blocks and differences within some of them make up the likelihood.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, stats
from threadpoolctl import threadpool_limits

from clockgeo.errors import DataError
from clockgeo.frequency.components import Components, Piece, fit_components, minus_two_log
from clockgeo.frequency.law_covariances import LAWS, of_blocks, of_samples
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.noise_doubt import schwarz_penalty
from clockgeo.frequency.session_blocks import SessionBlocks, mean_contrasts, session_blocks

__all__ = ["PowerLawFit", "fit_power_laws"]

_BLOCKS = 100
_WHOLE = 400
"""Ticks up to which every sample is a block of its own."""
_LONGEST_WINDOW = 64
_WINDOWS_TOGETHER = 384
"""Samples that the windows within blocks have together."""
_FEWEST_CONTRASTS = 12
_DOUBTFUL = 1e-3
_SLOW = LAWS[2:]
_TRIALS = 2
"""Least certain laws that are left out on trial at each step; two alike stand in for each other."""


@dataclass(frozen=True, eq=False)
class PowerLawFit:
    """Levels of the power laws that the data call for.

    Attributes
    ----------
    model : NoiseModel
        The likeliest levels of the chosen laws.
    u : dict of str to float
        Standard uncertainty of each chosen level, to first order.
    laws : tuple of str
        Chosen laws, in the order of `covariance`.
    covariance : float array, shape (k, k)
        Of the squared levels.
    information : dict of str to float
        Schwarz's criterion of every set of laws that was tried (joined by " + "); the smaller the
        better.
    short_times : bool
        Whether single samples took part. They do not where they are no plain averages, or fall
        under no power law together with the long ones, as behind a servo; the levels then hold
        beyond `from_seconds`.
    from_seconds : float
        Averaging time from which on the model holds.
    """

    model: NoiseModel
    u: dict[str, float]
    laws: tuple[str, ...]
    covariance: NDArray[np.float64]
    information: dict[str, float]
    short_times: bool
    from_seconds: float


def fit_power_laws(
    series: Sequence[TickSeries], *, interval: float, single_samples: bool = True
) -> PowerLawFit:
    """Fit white and flicker PM, white, flicker and random-walk FM to gapped sessions.

    Parameters
    ----------
    series : sequence of TickSeries
        Sessions of one process on one time line, each with a mean of its own.
    interval : float
        Length of a tick in s.
    single_samples : bool
        Whether samples are plain averages over their ticks. Those of a Λ counter are not, and tell
        nothing of power laws one by one; only means of many are taken then.

    Raises
    ------
    DataError
        If there are too few valid samples.

    Notes
    -----
    Restricted maximum likelihood (see `fit_components`) of contrasts between means of blocks and of
    contrasts within windows of blocks, which are independent for white noise and nearly so for the
    rest. Laws are left out one by one while Schwarz's criterion falls. Where the means alone are
    likelier by far at other levels, single samples follow no power law with them and are left out.
    """
    ticks = sum(int(one.tick[-1] - one.tick[0]) + 1 for one in series)
    number = ticks if ticks <= _WHOLE and single_samples else _BLOCKS
    blocks = session_blocks(series, interval, blocks=number, means=None)
    contrasts = mean_contrasts(blocks)
    if contrasts.shape[1] < _FEWEST_CONTRASTS:
        raise DataError(
            "too few valid samples to fit power laws",
            value=f"{blocks.y.size} blocks in {len(series)} sessions",
            allowed=f"At least {_FEWEST_CONTRASTS} more blocks than sessions",
        )
    width = round(blocks.width / interval)
    between = _between(series, blocks, contrasts, width, interval)
    take = single_samples and width > 1
    within = list(_within(series, blocks, width, interval)) if take else []
    short = single_samples and (bool(within) or width == 1)
    with threadpool_limits(limits=1, user_api="blas"):
        # The matrices are so small that threads would only wait for each other.
        chosen, information = _chosen([between, *within], LAWS if short else _SLOW)
        if within:
            alone, tried = _chosen([between], _SLOW)
            if _misfit(chosen, alone, between):
                chosen, information, short = alone, tried, False
    u = {
        law: float(np.sqrt(chosen.covariance[k, k])) / (2.0 * np.sqrt(chosen.levels[law]))
        for k, law in enumerate(chosen.names)
    }
    return PowerLawFit(
        model=NoiseModel(**{law: float(np.sqrt(level)) for law, level in chosen.levels.items()}),
        u=u,
        laws=chosen.names,
        covariance=chosen.covariance,
        information=information,
        short_times=short,
        from_seconds=interval if short else blocks.width,
    )


def _chosen(pieces: Sequence[Piece], laws: Sequence[str]) -> tuple[Components, dict[str, float]]:
    """Leave laws out while the criterion falls."""
    total = sum(piece.values.size for piece in pieces)
    best = fit_components(pieces, laws)
    names = best.names
    information = {" + ".join(names): _criterion(best, total)}
    while len(names) > 1:
        trials = [
            fit_components(pieces, [law for law in names if law != out], near=best.levels)
            for out in best.by_doubt[:_TRIALS]
        ]
        least = min(trials, key=lambda trial: _criterion(trial, total))
        for trial in trials:
            information.setdefault(" + ".join(trial.names), _criterion(trial, total))
        if _criterion(least, total) >= _criterion(best, total):
            break
        best, names = least, least.names
    return best, information


def _criterion(fit: Components, total: int) -> float:
    return fit.minus_two_log + schwarz_penalty(len(fit.names), total)


def _misfit(joint: Components, alone: Components, between: Piece) -> bool:
    """Whether long averages speak against what single samples have made of the levels."""
    loss = minus_two_log(between, joint.levels) - alone.minus_two_log
    return bool(loss > stats.chi2.ppf(1.0 - _DOUBTFUL, len(_SLOW)))


def _between(
    series: Sequence[TickSeries],
    blocks: SessionBlocks,
    contrasts: NDArray[np.float64],
    width: int,
    interval: float,
) -> Piece:
    if width == 1:
        whole = of_samples(blocks.place, interval)
    else:
        first = min(int(one.tick[0]) for one in series)
        ends = [_ends(one, first, width) for one in series]
        first_tick, last_tick, runs = (np.concatenate(part) for part in zip(*ends, strict=True))
        whole = of_blocks(
            blocks.place,
            blocks.count,
            (first_tick, last_tick + 1),
            runs,
            width=blocks.width,
            interval=interval,
        )
    return Piece.of_contrasts(contrasts, blocks.y, whole)


def _ends(
    one: TickSeries, first: int, width: int
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]:
    """First and last tick of each occupied block, and unbroken runs of samples in it."""
    block = (one.tick - first) // width
    changes = np.diff(block) > 0
    begins = np.concatenate(([True], (np.diff(one.tick) > 1) | changes))
    edges = np.flatnonzero(np.concatenate(([True], changes)))
    lasts = np.append(edges[1:] - 1, one.tick.size - 1)
    return one.tick[edges], one.tick[lasts], np.add.reduceat(begins.astype(np.float64), edges)


def _within(
    series: Sequence[TickSeries], blocks: SessionBlocks, width: int, interval: float
) -> Iterator[Piece]:
    """Contrasts within windows at the start of blocks, spread over all sessions."""
    first = min(int(one.tick[0]) for one in series)
    length = min(width, _LONGEST_WINDOW)
    wanted = max(_WINDOWS_TOGETHER // length, 1)
    chosen = np.unique(np.linspace(0, blocks.place.size - 1, wanted).astype(int))
    for row in chosen:
        start = first + int(blocks.place[row]) * width
        one = series[int(blocks.owner[row])]
        low, high = np.searchsorted(one.tick, [start, start + length])
        tick = one.tick[low:high]
        if tick.size > 1:
            contrasts = linalg.null_space(np.ones((1, tick.size)))
            covariances = of_samples(tick - tick[0], interval)
            yield Piece.of_contrasts(contrasts, one.y[low:high], covariances)
