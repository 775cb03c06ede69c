"""Noise of sessions that are still to come: covariance of their means from the stated models."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.schema import Campaign, Session
from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, TickSeries, mean_covariance
from clockgeo.times import SECOND_NS, tai_from_iso

__all__ = [
    "AVERAGING",
    "DEAD_TIME",
    "FLICKER",
    "LINK",
    "LINK_FLOOR",
    "STATISTICS",
    "noise_parts",
    "window_of",
]

STATISTICS = "statistics"
DEAD_TIME = "dead time"
FLICKER = "flicker floor"
LINK = "link noise"
LINK_FLOOR = "link floor"
AVERAGING = (STATISTICS, DEAD_TIME, LINK)
"""Parts that fall as one over the time."""

_RUN_S = 3600.0
"""Mean stretch of valid data where the uptime is below one; as in simulated records."""
_INTERVAL_S = 60.0
_FEWEST = 200
"""Samples that even the shortest session is divided into."""


def window_of(session: Session) -> tuple[int, int]:
    """Start and stop of a planned session in TAI nanoseconds.

    Raises
    ------
    DataError
        If it has no start or no length.
    """
    if session.start is None or session.planned_seconds is None:
        raise DataError(
            "a session cannot be planned without start and length",
            where=f"session {session.id}",
            advice="Give start and stop, or start and hours",
        )
    start = tai_from_iso(session.start.isoformat())
    return start, start + round(session.planned_seconds * SECOND_NS)


def noise_parts(campaign: Campaign, sessions: Sequence[Session]) -> dict[str, NDArray[np.float64]]:
    """Covariance of the means of planned sessions, split by cause.

    Parameters
    ----------
    campaign : Campaign
        States the instability of clocks and links.
    sessions : sequence of Session, length K
        With start, length and uptime.

    Returns
    -------
    dict of str to float array, shape (K, K)
        Fractional frequency squared: white noise of the clocks as if the uptime were one, what
        dead time adds to it, flicker and random-walk noise of the clocks, and the same of links.

    Notes
    -----
    The sum is what `frequency.mean_covariance` gives for records with these windows and uptimes.
    As in levelling, slow noise of a clock or link is one process through all its sessions, and
    sessions that share one at the same time share its white noise: σ² T_overlap/(T1 T2), which does
    not depend on the uptimes where the gaps are independent.
    """
    interval = _interval(sessions)
    gapped = [_series(one, interval, one.uptime) for one in sessions]
    whole = [_series(one, interval, 1.0) for one in sessions]
    size = len(sessions)
    parts = {name: np.zeros((size, size)) for name in (*AVERAGING, FLICKER, LINK_FLOOR)}
    for clock in campaign.clocks:
        signs = np.array(
            [
                float(one.numerator.clock == clock.id) - float(one.denominator.clock == clock.id)
                for one in sessions
            ]
        )
        fast, slow = _fast_and_slow(clock.instability)
        full = _block(fast, whole, signs, interval)
        parts[STATISTICS] += full
        parts[DEAD_TIME] += _added_by_gaps(full, _block(fast, gapped, signs, interval))
        parts[FLICKER] += _block(slow, gapped, signs, interval)
    for link in campaign.links:
        signs = np.array([float(link.id in one.links) for one in sessions])
        fast, slow = _fast_and_slow(link.instability)
        full = _block(fast, whole, signs, interval)
        parts[LINK] += full + _added_by_gaps(full, _block(fast, gapped, signs, interval))
        parts[LINK_FLOOR] += _block(slow, gapped, signs, interval)
    return parts


def _fast_and_slow(model: NoiseModel) -> tuple[NoiseModel, NoiseModel]:
    """White and phase noise, which average; flicker and random walk, which do not."""
    slow = NoiseModel(flicker_fm=model.flicker_fm, random_walk_fm=model.random_walk_fm)
    return model.model_copy(update={"flicker_fm": 0.0, "random_walk_fm": 0.0}), slow


def _block(
    model: NoiseModel, series: Sequence[TickSeries], signs: NDArray[np.float64], interval: float
) -> NDArray[np.float64]:
    block = np.zeros((signs.size, signs.size))
    present = np.flatnonzero(signs).tolist()
    if present and np.any(model.allan_variance([1.0, 1e5]) > 0.0):
        part = mean_covariance(model, [series[k] for k in present], interval=interval)
        block[np.ix_(present, present)] = np.outer(signs[present], signs[present]) * part
    return block


def _added_by_gaps(whole: NDArray[np.float64], gapped: NDArray[np.float64]) -> NDArray[np.float64]:
    """What gaps add to variances; covariances of overlapping sessions do not depend on them."""
    return np.diag(np.diag(gapped) - np.diag(whole))


def _interval(sessions: Sequence[Session]) -> float:
    shortest = min(one.planned_seconds or _INTERVAL_S for one in sessions)
    return min(_INTERVAL_S, shortest / _FEWEST)


def _series(session: Session, interval: float, uptime: float) -> TickSeries:
    """Ticks of valid samples: stretches of an hour with gaps that leave the stated uptime."""
    start, stop = window_of(session)
    step = interval * SECOND_NS
    count = max(round((stop - start) / step), 1)
    tick = np.arange(count, dtype=np.int64)
    if uptime < 1.0:
        cycle = min(_RUN_S / interval, count * uptime) / uptime
        # The valid part stands in the middle of each cycle, so that the mean time stays.
        phase = np.abs(np.mod(tick + 0.5, cycle) / cycle - 0.5)
        kept = np.argsort(phase, kind="stable")[: max(round(count * uptime), 1)]
        tick = np.sort(kept)
    return TickSeries(round(start / step) + tick, np.zeros(tick.size))
