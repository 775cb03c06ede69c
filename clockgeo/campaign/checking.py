"""Is the document right, are its records there, and do they lie where it says."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path

from clockgeo.campaign.document import Document, read_document
from clockgeo.campaign.geodetic import geodetic_numbers
from clockgeo.campaign.measuring import Measured, measure
from clockgeo.campaign.schema import Session
from clockgeo.errors import CampaignError, ClockgeoError
from clockgeo.progress import track
from clockgeo.times import SECOND_NS, iso_utc, tai_from_iso

__all__ = ["CheckReport", "SessionState", "check_campaign"]

_SLACK_S = 3600.0
"""How far a record may reach beyond its session's stated times before it is questioned."""


@dataclass(frozen=True)
class SessionState:
    """How a session stands: planned, measured, or with a problem."""

    id: str
    numerator: str
    denominator: str
    state: str
    valid_seconds: float | None = None
    uptime: float | None = None


@dataclass(frozen=True)
class CheckReport:
    """Everything found.

    Attributes
    ----------
    name : str
        The campaign's name, or the file's.
    sessions : list of SessionState
    notes : list of str
        What is legal but worth a look.
    problems : list of str
        What must be mended, each with its place and what to do.
    """

    name: str
    sessions: list[SessionState] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    problems: list[str] = field(default_factory=list)


def check_campaign(path: str | Path) -> CheckReport:
    """Check a document and every record it names; collect all problems rather than stop.

    Parameters
    ----------
    path : path
        The campaign document.
    """
    try:
        document = read_document(path)
    except CampaignError as error:
        return CheckReport(str(path), problems=error.problems)
    except ClockgeoError as error:
        return CheckReport(str(path), problems=[str(error)])
    report = CheckReport(document.campaign.head.name)
    measured: list[Measured] = []
    for session in track(document.campaign.sessions, "checking records"):
        _check_session(document, session, report, measured)
    _check_places(measured, report)
    try:
        geodetic_numbers(document.campaign, document.folder, _sites(document))
    except ClockgeoError as error:
        report.problems.append(f"[geoid]: {error}")
    return report


def _sites(document: Document) -> list[str]:
    return [site.id for site in document.campaign.sites]


def _check_session(
    document: Document, session: Session, report: CheckReport, measured: list[Measured]
) -> None:
    n, d = (f"{place.clock} at {place.site}" for place in session.places)
    if session.record is None:
        report.sessions.append(SessionState(session.id, n, d, "planned"))
        return
    try:
        one = measure(document.campaign, session, document.folder)
    except ClockgeoError as error:
        report.sessions.append(SessionState(session.id, n, d, "problem"))
        report.problems.append(f"[[session]] {session.id!r}: {error}")
        return
    measured.append(one)
    valid = one.series.y.size * one.record.interval
    report.sessions.append(
        SessionState(session.id, n, d, "measured", valid, valid / one.record.span)
    )
    report.notes.extend(f"[[session]] {session.id!r}: {note}" for note in one.record.notes)
    report.problems.extend(_outside_its_time(session, one))


def _outside_its_time(session: Session, one: Measured) -> list[str]:
    """A record that does not lie in its session's stated time belongs to another session."""
    for stated, found, sign in (
        (session.start, one.record.start, 1.0),
        (session.planned_stop, one.record.stop, -1.0),
    ):
        if stated is None:
            continue
        early = sign * (_tai(stated) - found) / SECOND_NS
        if early > _SLACK_S:
            word = "starts" if sign > 0 else "stops"
            problem = (
                f"[[session]] {session.id!r}: its record {word} at {iso_utc(found, digits=0)}, "
                f"outside the stated {stated:%Y-%m-%dT%H:%MZ}; correct the times or the file"
            )
            return [problem]
    return []


def _tai(instant: datetime) -> int:
    return tai_from_iso(instant.isoformat())


def _check_places(measured: list[Measured], report: CheckReport) -> None:
    """A clock cannot be at two sites while two records run."""
    for place, first in enumerate(measured):
        for second in measured[place + 1 :]:
            overlap = (
                first.record.start < second.record.stop and second.record.start < first.record.stop
            )
            for here in first.session.places if overlap else ():
                for there in second.session.places:
                    if here.clock == there.clock and here.site != there.site:
                        report.problems.append(
                            f"[[session]] {second.session.id!r}: clock {here.clock!r} is at "
                            f"{there.site!r} while the record of {first.session.id!r} has it at "
                            f"{here.site!r}"
                        )
