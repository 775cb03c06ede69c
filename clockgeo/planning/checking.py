"""Can this document be planned at all? Every problem at once, before anything is computed."""

from __future__ import annotations

from collections.abc import Iterator

from clockgeo.campaign.document import Document
from clockgeo.campaign.schema import Campaign
from clockgeo.errors import CampaignError

__all__ = ["refuse_what_cannot_be_planned"]


def refuse_what_cannot_be_planned(document: Document) -> None:
    """Raise with all that stands in the way of a plan.

    Raises
    ------
    CampaignError
        If there is no target, nothing to plan, a session without length or with zero uptime, an
        impossible date, or a candidate that names what is not there.
    """
    campaign = document.campaign
    problems = [
        *_target_problems(campaign),
        *_session_problems(campaign),
        *_date_problems(campaign),
        *_candidate_problems(campaign),
        *_name_problems(campaign),
    ]
    if problems:
        raise CampaignError(problems, where=str(document.path))


def _target_problems(campaign: Campaign) -> Iterator[str]:
    target = campaign.target
    if target is None or not (target.differences or target.offsets):
        yield (
            "[target]: missing; a plan needs a difference (from, to, u_height) or an offset "
            "(from, to, u) to reach"
        )
        return
    for one in target.differences:
        if one.from_site == one.to_site:
            yield f"[target]: difference from {one.from_site!r} to itself; name two sites"
    datums = {datum.id for datum in campaign.datums}
    for offset in target.offsets:
        for name in (offset.from_datum, offset.to_datum):
            if name not in datums:
                known = ", ".join(sorted(datums)) or "none"
                yield f"[target], offset: no [[datum]] is called {name!r}; known: {known}"
        if offset.from_datum == offset.to_datum:
            yield f"[target]: offset from {offset.from_datum!r} to itself; name two datums"


def _session_problems(campaign: Campaign) -> Iterator[str]:
    if not campaign.sessions and not campaign.candidates:
        yield "no [[session]] and no [[candidate]]: there is nothing to plan"
    for session in campaign.sessions:
        place = f"[[session]] {session.id!r}"
        if session.start is None or session.planned_seconds is None:
            yield f"{place}: a plan needs its start and its stop or hours"
        if session.uptime == 0.0:
            yield f"{place}, uptime: zero, so it would bring no data; give a share above 0"


def _date_problems(campaign: Campaign) -> Iterator[str]:
    deadline = campaign.target.deadline if campaign.target else None
    if deadline is None:
        return
    starts = [session.start for session in campaign.sessions if session.start is not None]
    if campaign.plan.start is not None:
        starts.append(campaign.plan.start)
    if starts and min(starts) >= deadline:
        yield (
            f"[target], deadline: {deadline:%Y-%m-%dT%H:%MZ} is not after the start of the "
            f"campaign, {min(starts):%Y-%m-%dT%H:%MZ}"
        )


def _candidate_problems(campaign: Campaign) -> Iterator[str]:
    if not campaign.candidates:
        return
    plan, target = campaign.plan, campaign.target
    if plan.days is None and (target is None or target.budget is None):
        yield "[plan]: candidates need days to share, or a budget in [target]"
    if plan.start is None and not campaign.sessions:
        yield "[plan], start: missing; without planned sessions the candidates need a start"
    least = sum(one.least_days for one in campaign.candidates)
    if plan.days is not None and least > plan.days:
        yield f"[plan], days: {plan.days:g} are fewer than the least_days of all, {least:g}"
    if plan.days is None and not (plan.costs.day or plan.costs.move or plan.costs.kilometre):
        yield "[plan], costs: a budget shares nothing out while everything costs 0"


def _name_problems(campaign: Campaign) -> Iterator[str]:
    sites = {site.id for site in campaign.sites}
    clocks = {clock.id for clock in campaign.clocks}
    links = {link.id for link in campaign.links}
    used = {session.id for session in campaign.sessions}
    for one in campaign.candidates:
        place = f"[[candidate]] {one.id!r}"
        if one.id in used:
            yield f"{place}: the id is used already; give each its own"
        used.add(one.id)
        for placed in one.places:
            if placed.clock not in clocks:
                yield f"{place}: no [[clock]] is called {placed.clock!r}"
            if placed.site not in sites:
                yield f"{place}: no [[site]] is called {placed.site!r}"
        if one.numerator.clock == one.denominator.clock:
            yield f"{place}: clock {one.numerator.clock!r} is compared with itself; name two"
        yield from (
            f"{place}, links: no [[link]] is called {name!r}"
            for name in one.links
            if name not in links
        )
        if one.uptime == 0.0:
            yield f"{place}, uptime: zero, so it would bring no data; give a share above 0"
