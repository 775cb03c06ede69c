"""Noise that sessions of different pairs have in common: of a clock or a link that is in both."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.grouping import Group, stated_model
from clockgeo.campaign.measuring import Measured
from clockgeo.campaign.schema import Campaign, Session
from clockgeo.frequency import NoiseModel, TickSeries, mean_covariance
from clockgeo.times import SECOND_NS

__all__ = ["campaign_span", "shared_noise"]

_LAWS = ("white_fm", "flicker_fm", "random_walk_fm")
_SAME = 1e-9
"""Relative difference of sampling intervals that count as one."""


def campaign_span(measured: Sequence[Measured]) -> float:
    """Time from the start of the first session to the end of the last, s."""
    start = min(one.record.start for one in measured)
    return (max(one.record.stop for one in measured) - start) / SECOND_NS


def shared_noise(
    campaign: Campaign, groups: Sequence[Group], measured: Sequence[Measured]
) -> NDArray[np.float64]:
    """Covariance of sessions of different groups through the clocks and links in both.

    Parameters
    ----------
    campaign : Campaign
        Its stated instabilities say how the fitted noise of a group falls to its clocks and links.
    groups : sequence of Group
    measured : sequence of Measured, length K

    Returns
    -------
    float array, shape (K, K)
        Fractional squared; zero within each group. White FM counts where sessions overlap, slower
        noise on the real time line, with the campaign's span for its level.

    Notes
    -----
    Of the groups that contain a clock or link the one that leaves it the least noise counts, so
    that the common part never exceeds the whole, and the covariance stays positive.
    """
    covariance = np.zeros((len(measured), len(measured)))
    group_of = np.zeros(len(measured), dtype=int)
    for number, group in enumerate(groups):
        group_of[list(group.members)] = number
    levels = _levels(campaign, groups, measured)
    if not levels:
        return covariance
    series, interval = _one_line(measured)
    for owner, level in levels.items():
        signs = np.array([_signs(one.session).get(owner, 0.0) for one in measured])
        places = np.flatnonzero(signs)
        block = mean_covariance(
            level,
            [series[place] for place in places],
            interval=interval,
            span=campaign_span(measured),
        )
        apart = group_of[places][:, None] != group_of[places][None, :]
        turned = np.outer(signs[places], signs[places])
        covariance[np.ix_(places, places)] += np.where(apart, turned * block, 0.0)
    return covariance


def _signs(session: Session) -> dict[str, float]:
    """Clocks and links of a session with the sign of their noise in y."""
    return {
        session.numerator.clock: 1.0,
        session.denominator.clock: -1.0,
        **dict.fromkeys(session.links, 1.0),
    }


def _levels(
    campaign: Campaign, groups: Sequence[Group], measured: Sequence[Measured]
) -> dict[str, NoiseModel]:
    """Noise of each clock and link that is in several groups."""
    found: dict[str, list[NoiseModel]] = {}
    for group in groups:
        one = measured[group.members[0]]
        stated = stated_model(campaign, one)
        for owner in _signs(one.session):
            own = _instability(campaign, owner)
            shares = {
                law: getattr(group.model, law) * getattr(own, law) / getattr(stated, law)
                for law in _LAWS
                if getattr(stated, law) > 0.0
            }
            found.setdefault(owner, []).append(NoiseModel(**shares))
    least = {
        owner: NoiseModel(**{law: min(getattr(one, law) for one in shares) for law in _LAWS})
        for owner, shares in found.items()
        if len(shares) > 1
    }
    return {owner: level for owner, level in least.items() if level != NoiseModel()}


def _instability(campaign: Campaign, owner: str) -> NoiseModel:
    clocks = {clock.id: clock.instability for clock in campaign.clocks}
    return clocks[owner] if owner in clocks else campaign.link(owner).instability


def _one_line(measured: Sequence[Measured]) -> tuple[list[TickSeries], float]:
    """Valid samples of all sessions on the time line of the shortest interval."""
    intervals = [one.record.interval for one in measured]
    shortest = min(intervals)
    if max(intervals) <= shortest * (1.0 + _SAME):
        return [one.series for one in measured], shortest
    return [_stretched(one, shortest) for one in measured], shortest


def _stretched(one: Measured, interval: float) -> TickSeries:
    """Repeat each sample over the ticks of a finer line that it covers."""
    starts = one.record.tai_ns[one.screening.valid] / SECOND_NS
    first = np.rint(starts / interval).astype(np.int64)
    last = np.rint((starts + one.record.interval) / interval).astype(np.int64)
    # Rounding may leave two neighbours one tick; it falls to the later one.
    first[1:] = np.maximum(first[1:], last[:-1])
    count = np.maximum(last - first, 0)
    offset = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    return TickSeries(np.repeat(first, count) + offset, np.repeat(one.series.y, count))
