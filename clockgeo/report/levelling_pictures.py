"""The pictures of a level page, each with its caption and its text for those who cannot see it."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from clockgeo.campaign.evidence import Evidence
from clockgeo.campaign.results import LevelResult, SessionResult
from clockgeo.planning.results import PlannedSession
from clockgeo.report.levelling_sheets import Solved, budget_pairs
from clockgeo.report.numbers import duration, percentage, rounded, typeset, with_uncertainty
from clockgeo.report.page import Picture
from clockgeo.report.pictures.budget import budget_picture
from clockgeo.report.pictures.comparison import (
    comparison_picture,
    correlation_picture,
    residual_picture,
)
from clockgeo.report.pictures.places import MapSite, site_map
from clockgeo.report.pictures.record import record_picture
from clockgeo.report.pictures.stability import stability_picture
from clockgeo.report.pictures.timeline import TimelineSession, timeline_picture
from clockgeo.times import tai_from_iso

__all__ = [
    "budget_pictures",
    "campaign_map",
    "campaign_timeline",
    "comparison_pictures",
    "correlation_pictures",
    "record_pictures",
    "residual_pictures",
    "stability_pictures",
    "timeline_sessions",
]


def campaign_map(result: Solved) -> Picture:
    """Sites, and which were compared."""
    names = {site.id: site.name for site in result.sites}
    sites = [
        MapSite(
            name=site.name,
            latitude=site.latitude,
            longitude=site.longitude,
            note="C = " + with_uncertainty(site.geopotential_number, site.u, "m² s⁻²"),
            reference=site.id == result.conventions.reference_site,
        )
        for site in result.sites
    ]
    connections = [(names[s.numerator_site], names[s.denominator_site]) for s in result.sessions]
    return Picture(
        id="map",
        figure=site_map(sites, connections),
        caption="Sites with their geopotential numbers; lines join sites that were compared. "
        "A circle marks comparisons in one place.",
        alt="Map of the sites: "
        + "; ".join(f"{s.name} at {s.latitude:.3f}°, {s.longitude:.3f}°" for s in sites),
    )


def timeline_sessions(sessions: Iterable[SessionResult | PlannedSession]) -> list[TimelineSession]:
    """Sessions, measured or planned, as the timeline draws them."""
    return [
        TimelineSession(
            name=s.id,
            start=tai_from_iso(s.start),
            stop=tai_from_iso(s.stop),
            clocks=(s.numerator_clock, s.denominator_clock),
            sites=(s.numerator_site, s.denominator_site),
            uptime=s.uptime,
        )
        for s in sessions
    ]


def campaign_timeline(result: Solved) -> Picture:
    """When each clock was where."""
    return Picture(
        id="timeline",
        figure=timeline_picture(timeline_sessions(result.sessions)),
        caption="One lane a clock. Blocks are sessions, filled as high as their uptime; lines "
        "under them are stays at a site.",
        alt="Timeline: "
        + "; ".join(
            f"{s.id} from {s.start[:16]} for {duration(s.span_seconds)}, "
            f"uptime {percentage(s.uptime)}"
            for s in result.sessions
        ),
    )


def record_pictures(result: LevelResult, evidence: Evidence) -> Iterator[Picture]:
    """One picture a session."""
    by_name = {record.session: record for record in evidence.records}
    for number, session in enumerate(result.sessions, start=1):
        record = by_name[session.id]
        clocks = (
            f"{session.numerator_clock} at {session.numerator_site} over "
            f"{session.denominator_clock} at {session.denominator_site}"
        )
        flagged = {k: n for k, n in session.flagged.items() if n and k != "not_usable"}
        told = ", ".join(f"{n} {k.replace('_', ' ')}" for k, n in flagged.items()) or "none"
        yield Picture(
            id=f"record-{number}",
            figure=record_picture(
                record.tai_ns,
                record.y,
                record.reasons,
                interval=record.interval,
                u_mean=session.u_statistical,
                title=session.id,
            ),
            caption=f"{session.id}: {clocks}. Valid {duration(session.valid_seconds)} of "
            f"{duration(session.span_seconds)} ({percentage(session.uptime)}); flagged: {told}. "
            "Markers on the edge lie beyond it. As read, before corrections.",
            alt=f"Fractional frequency of {session.id} against time; flagged epochs: {told}",
        )


def stability_pictures(evidence: Evidence) -> Iterator[Picture]:
    """One picture a noise group that has curves."""
    for number, group in enumerate(evidence.groups, start=1):
        if not group.curves:
            continue
        yield Picture(
            id=f"stability-{number}",
            figure=stability_picture(group.curves, model=group.model, title=group.name),
            caption=f"{group.name}: deviations with their intervals over "
            f"{len(group.sessions)} session(s), gaps kept, and the noise model that the "
            "uncertainty follows.",
            alt=f"Stability of {group.name}; the noise table below holds the model's levels",
        )


def budget_pictures(result: Solved) -> Iterator[tuple[tuple[str, str], Picture]]:
    """One picture a pair with the reference site."""
    for number, pair in enumerate(budget_pairs(result), start=1):
        lines = [e for e in result.effects if (e.from_site, e.to_site) == pair]
        largest = max(lines, key=lambda line: line.height_mm)
        yield (
            pair,
            Picture(
                id=f"budget-{number}",
                figure=budget_picture(lines),
                caption=f"What makes up the standard uncertainty, {pair[0]} to {pair[1]}.",
                alt=f"Bars of the budget; the largest part is {largest.effect}, "
                f"{rounded(largest.height_mm)} mm",
            ),
        )


def correlation_pictures(result: Solved) -> Iterator[Picture]:
    """Nothing where there are fewer than three sites: the table says it all."""
    order = result.covariance.order
    if len(order) > 2:
        yield Picture(
            id="correlations",
            figure=correlation_picture(order, result.covariance.matrix),
            caption="Correlation of the geopotential numbers: filled squares are positive, hollow "
            "ones negative, their area is the size.",
            alt="Correlations of the geopotential numbers; the table below holds the covariance",
        )


def comparison_pictures(result: LevelResult) -> Iterator[Picture]:
    """Clocks against geodesy."""
    yield Picture(
        id="comparison",
        figure=comparison_picture(result.comparison),
        caption="Each difference twice: from geodesy (at zero) and from clocks.",
        alt="; ".join(
            f"{c.from_site} to {c.to_site}: clocks minus geodesy "
            + typeset(with_uncertainty(c.difference, c.u, "m² s⁻²"))
            for c in result.comparison
        ),
    )


def residual_pictures(result: Solved) -> Iterator[Picture]:
    """Sessions about the solution."""
    yield Picture(
        id="residuals",
        figure=residual_picture(result.sessions),
        caption="Residual of every session. The whole u has parts that sessions share, so that "
        "residuals scatter by the statistical u.",
        alt="Residuals: "
        + "; ".join(f"{s.id} {typeset(rounded(s.residual))}" for s in result.sessions),
    )
