"""The journey: where each clock stays, how it moves, what that costs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

from clockgeo.campaign.schema import Campaign, Session
from clockgeo.errors import DataError
from clockgeo.planning.alternatives import distance_between

__all__ = ["Stay", "placed_in_time", "stays_in", "total_cost"]


@dataclass(frozen=True)
class Stay:
    """A clock at a site from its first to its last session there.

    Attributes
    ----------
    clock, site : str
    start, stop : datetime
    distance : float
        Way from the stay before in m; 0 for the first.
    """

    clock: str
    site: str
    start: datetime
    stop: datetime
    distance: float

    @property
    def moved(self) -> bool:
        """Whether the clock was moved to get there."""
        return self.distance > 0.0


def stays_in(campaign: Campaign, sessions: Sequence[Session]) -> list[Stay]:
    """List the stays of every clock, clock by clock in order of time."""
    by_clock: dict[str, list[tuple[datetime, datetime, str]]] = {}
    for session in sessions:
        if session.start is None or session.planned_stop is None:
            continue
        for place in session.places:
            visit = (session.start, session.planned_stop, place.site)
            by_clock.setdefault(place.clock, []).append(visit)
    stays: list[Stay] = []
    for clock, visits in by_clock.items():
        last: Stay | None = None
        for start, stop, site in sorted(visits):
            if last is not None and last.site == site:
                last = Stay(clock, site, last.start, max(stop, last.stop), last.distance)
                stays[-1] = last
                continue
            way = 0.0
            if last is not None:
                way = distance_between(campaign.site(last.site), campaign.site(site))
            last = Stay(clock, site, start, stop, way)
            stays.append(last)
    return stays


def total_cost(campaign: Campaign, days: float, stays: Sequence[Stay]) -> float:
    """Cost of days, moves and kilometres in the document's unit."""
    costs = campaign.plan.costs
    moved = [stay for stay in stays if stay.moved]
    kilometres = sum(stay.distance for stay in moved) / 1e3
    return costs.day * days + costs.move * len(moved) + costs.kilometre * kilometres


def placed_in_time(campaign: Campaign, days: Mapping[str, float]) -> list[Session]:
    """Make sessions of the candidates that got days, one after the other in their order.

    Parameters
    ----------
    campaign : Campaign
        With candidates; its planned sessions come first.
    days : mapping of str to float
        Candidate -> days; 0 leaves it out.

    Returns
    -------
    list of Session
        A clock that changes its site is on the way for `move_days` first.

    Raises
    ------
    DataError
        If nothing says when they start.
    """
    ends = [stop for one in campaign.sessions if (stop := one.planned_stop) is not None]
    now = max([*ends, *([campaign.plan.start] if campaign.plan.start else [])], default=None)
    if now is None:
        raise DataError(
            "nothing says when the candidates start", where="[plan]", advice="Give its start"
        )
    at: dict[str, str] = {}
    for one in sorted((s for s in campaign.sessions if s.start), key=lambda s: s.start or now):
        at |= {place.clock: place.site for place in one.places}
    sessions: list[Session] = []
    for candidate in campaign.candidates:
        length = days.get(candidate.id, 0.0)
        if length <= 0.0:
            continue
        if any(at.get(place.clock, place.site) != place.site for place in candidate.places):
            now += timedelta(days=campaign.plan.move_days)
        at |= {place.clock: place.site for place in candidate.places}
        sessions.append(
            Session(
                id=candidate.id,
                numerator=candidate.numerator,
                denominator=candidate.denominator,
                links=candidate.links,
                start=now,
                hours=24.0 * length,
                uptime=candidate.uptime,
            )
        )
        now += timedelta(days=length)
    return sessions
