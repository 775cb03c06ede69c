"""Is the document right, are its records there, and do they lie where it says."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from clockgeo.campaign.document import Document, read_document
from clockgeo.campaign.geodetic import geodetic_numbers
from clockgeo.campaign.measuring import Measured, measure
from clockgeo.campaign.plausibility import record_problems
from clockgeo.campaign.schema import Session
from clockgeo.errors import CampaignError, ClockgeoError
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.progress import track

__all__ = ["CheckReport", "SessionState", "check_campaign"]


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
    doubts : list of str
        What must be looked at before anything is made of the records.
    problems : list of str
        What must be mended, each with its place and what to do.
    """

    name: str
    sessions: list[SessionState] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    doubts: list[str] = field(default_factory=list)
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
    report.problems.extend(record_problems(measured))
    try:
        geodetic_numbers(document.campaign, document.folder, _sites(document))
    except ClockgeoError as error:
        report.problems.append(f"[geoid]: {error}")
    _check_network(document, report)
    return report


def _check_network(document: Document, report: CheckReport) -> None:
    """Read the tables of the height network, if there are any, as `adjust` will."""
    campaign = document.campaign
    if not (campaign.levellings or campaign.datums or campaign.gnss or campaign.tide_gauges):
        return
    from clockgeo.campaign.networking import add_network  # heavy: only for a network

    try:
        rows = add_network(ModelBuilder(), document)
    except ClockgeoError as error:
        report.problems.append(str(error))
        return
    counted = ", ".join(f"{len(ids)} of {name}" for name, ids in rows.groups.items())
    report.notes.append(f"height network: {len(rows.points.ids)} points; observations: {counted}")


def _sites(document: Document) -> list[str]:
    return [site.id for site in document.campaign.sites]


def _check_session(
    document: Document, session: Session, report: CheckReport, measured: list[Measured]
) -> None:
    n, d = (f"{place.clock} at {place.site}" for place in session.places)
    if not session.measured:
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
    place = f"[[session]] {session.id!r}"
    report.notes.extend(f"{place}: {note}" for note in one.record.notes)
    report.doubts.extend(f"{place}: {doubt}" for doubt in one.record.doubts)
