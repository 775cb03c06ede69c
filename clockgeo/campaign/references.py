"""Do the tables of a document fit together? Names that must exist, times that must not clash."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator
from itertools import combinations
from typing import Any

from clockgeo.campaign.schema import Campaign, Session
from clockgeo.errors import DataError
from clockgeo.frequency import find_transition

__all__ = ["reference_problems"]


def reference_problems(raw: dict[str, Any], campaign: Campaign | None) -> list[str]:
    """List what does not fit together, as sentences.

    Parameters
    ----------
    raw : dict
        The document as read; names are checked on it even where single values are wrong.
    campaign : Campaign or None
        The validated document, if it is valid; times and conventions are checked on it.
    """
    kinds = ("site", "clock", "link", "session", "datum", "levelling", "gnss")
    names = {kind: _ids(raw, kind) for kind in kinds}
    problems = [
        f"[[{kind}]] {name!r}: the id is used {ids.count(name)} times; give each its own"
        for kind, ids in names.items()
        for name in sorted({name for name in ids if ids.count(name) > 1})
    ]
    problems += [
        f"{place}: no [[{kind}]] is called {name!r}; {_nearest(name, names[kind])}"
        for place, kind, name in _references(raw)
        if isinstance(name, str) and name not in names[kind]
    ]
    if campaign is not None and not problems:
        problems += [*_reference_site(campaign), *_sessions(campaign), *_clocks(campaign)]
        problems += [*_truth(campaign), *_targets(campaign), *_conventions(campaign)]
    return problems


def _ids(raw: dict[str, Any], kind: str) -> list[str]:
    tables = raw.get(kind, [])
    return [t["id"] for t in tables if isinstance(t, dict) and isinstance(t.get("id"), str)]


def _nearest(name: str, known: Iterable[str]) -> str:
    near = difflib.get_close_matches(name, list(known), n=1, cutoff=0.5)
    return f"did you mean {near[0]!r}?" if near else f"known: {', '.join(sorted(known)) or 'none'}"


def _references(raw: dict[str, Any]) -> Iterator[tuple[str, str, Any]]:
    """Every (place, kind, name) where one table names another."""
    head = raw.get("campaign")
    if isinstance(head, dict):
        yield "[campaign], reference_site", "site", head.get("reference_site")
    for session in raw.get("session", []):
        if not isinstance(session, dict):
            continue
        place = f"[[session]] {session.get('id')!r}"
        for role in ("numerator", "denominator"):
            placed = session.get(role)
            if isinstance(placed, dict):
                yield f"{place}, {role}, clock", "clock", placed.get("clock")
                yield f"{place}, {role}, site", "site", placed.get("site")
        for link in session.get("links", []):
            yield f"{place}, links", "link", link
    for site in raw.get("site", []):
        atoms = site.get("atoms_of", {}) if isinstance(site, dict) else {}
        for clock in atoms if isinstance(atoms, dict) else {}:
            yield f"[[site]] {site.get('id')!r}, atoms_of", "clock", clock


def _reference_site(campaign: Campaign) -> Iterator[str]:
    head = campaign.head
    if campaign.site(head.reference_site).geopotential_number is None:
        yield (
            f"[[site]] {head.reference_site!r}: the reference site needs a geopotential_number; "
            "give its C in m2 s-2 (0 for heights relative to it)"
        )


def _conventions(campaign: Campaign) -> Iterator[str]:
    """GNSS heights are usually tide-free, whatever the campaign counts in: to be stated."""
    placed = any(site.ellipsoidal_height is not None for site in campaign.sites)
    if campaign.geoid is not None and placed and campaign.head.ellipsoidal_tide_system is None:
        yield (
            "[campaign], ellipsoidal_tide_system: missing; with a [geoid] it must be stated "
            "(mean_tide, zero_tide or tide_free; GNSS heights are usually tide_free)"
        )


def _sessions(campaign: Campaign) -> Iterator[str]:
    if campaign.head.epoch is None:
        for site in campaign.sites:
            if site.uplift_rate or site.u_uplift_rate:
                yield f"[[site]] {site.id!r}, uplift_rate: needs the epoch in [campaign]"
    for session in campaign.sessions:
        place = f"[[session]] {session.id!r}"
        n, d = session.places
        if n.clock == d.clock:
            yield f"{place}: clock {n.clock!r} is compared with itself; name two clocks"
        if not session.measured and session.start is None:
            yield f"{place}: needs a start (planned) or a record (measured)"
        if not session.measured and session.start and session.planned_stop is None:
            yield f"{place}: needs a stop or hours, so that its length is known"
    for first, second in combinations(campaign.sessions, 2):
        yield from _in_two_places(first, second)


def _in_two_places(first: Session, second: Session) -> Iterator[str]:
    if not _overlap(first, second):
        return
    for here in first.places:
        for there in second.places:
            if here.clock == there.clock and here.site != there.site:
                yield (
                    f"[[session]] {second.id!r}: clock {here.clock!r} is at {there.site!r} while "
                    f"session {first.id!r} has it at {here.site!r}; their times overlap"
                )


def _overlap(first: Session, second: Session) -> bool:
    stops = first.planned_stop, second.planned_stop
    if first.start is None or second.start is None or stops[0] is None or stops[1] is None:
        return False
    return first.start < stops[1] and second.start < stops[0]


def _clocks(campaign: Campaign) -> Iterator[str]:
    for clock in campaign.clocks:
        place = f"[[clock]] {clock.id!r}"
        if clock.transition is None and clock.nominal_frequency is None:
            yield f"{place}: needs a transition (such as '87Sr') or a nominal_frequency in Hz"
        elif clock.nominal_frequency is None and clock.transition is not None:
            try:
                find_transition(clock.transition)
            except DataError as error:
                yield f"{place}: {error}"


def _truth(campaign: Campaign) -> Iterator[str]:
    if campaign.truth is None:
        return
    sites = {site.id for site in campaign.sites}
    used = {place.site for session in campaign.sessions for place in session.places}
    given = set(campaign.truth.geopotential_numbers)
    for name in sorted(given - sites):
        yield f"[truth], geopotential_numbers: no [[site]] is called {name!r}"
    for name in sorted(used - given):
        yield f"[truth], geopotential_numbers: site {name!r} is in a session and has no number"


def _targets(campaign: Campaign) -> Iterator[str]:
    sites = [site.id for site in campaign.sites]
    for difference in campaign.target.differences if campaign.target else ():
        for name in (difference.from_site, difference.to_site):
            if name not in sites:
                yield f"[target]: no [[site]] is called {name!r}; {_nearest(name, sites)}"
