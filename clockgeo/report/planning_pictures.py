"""The pictures of a plan's page, each with its caption and its text for those who cannot see it."""

from __future__ import annotations

from collections.abc import Iterator

from clockgeo.planning.results import PlanResult, TargetResult
from clockgeo.report.levelling_pictures import timeline_sessions
from clockgeo.report.numbers import percentage, rounded
from clockgeo.report.page import Picture
from clockgeo.report.pictures.budget import budget_picture
from clockgeo.report.pictures.places import MapSite, site_map
from clockgeo.report.pictures.planning import alternatives_picture, reach_picture
from clockgeo.report.pictures.timeline import timeline_picture

__all__ = [
    "alternatives_pictures",
    "budget_pictures",
    "plan_map",
    "plan_timeline",
    "reach_pictures",
]


def plan_map(result: PlanResult) -> Picture:
    """Sites with the days that they get."""
    names = {site.id: site.name for site in result.sites}
    reference = result.conventions.reference_site
    days: dict[str, float] = dict.fromkeys(names, 0.0)
    for session in result.sessions:
        for site in {session.numerator_site, session.denominator_site}:
            days[site] += session.days
    sites = [
        MapSite(
            name=site.name,
            latitude=site.latitude,
            longitude=site.longitude,
            note=f"{days[site.id]:.1f} d" if site.used else "not visited",
            reference=site.id == reference,
        )
        for site in result.sites
    ]
    pairs = [(names[s.numerator_site], names[s.denominator_site]) for s in result.sessions]
    return Picture(
        id="map",
        figure=site_map(sites, pairs),
        caption="Sites with the days of comparison that they take part in; lines join sites that "
        "are compared, with the number of sessions. A circle marks comparisons in one place.",
        alt="Map of the plan: " + "; ".join(f"{site.name}, {site.note}" for site in sites),
    )


def plan_timeline(result: PlanResult) -> Picture:
    """When each clock is to be where."""
    return Picture(
        id="timeline",
        figure=timeline_picture(timeline_sessions(result.sessions)),
        caption="One lane a clock. Blocks are sessions, filled as high as their expected uptime; "
        "lines under them are stays at a site, dotted ones are moves.",
        alt="Timeline: "
        + "; ".join(
            f"{s.id} from {s.start[:16]} for {s.days:.1f} d, uptime {percentage(s.uptime)}"
            for s in result.sessions
        ),
    )


def reach_pictures(result: PlanResult) -> Iterator[tuple[TargetResult, Picture]]:
    """Predicted u of every target against the time spent."""
    for number, (target, curve) in enumerate(
        zip(result.targets, result.reach, strict=True), start=1
    ):
        wanted = 1e3 * target.required_u
        yield (
            target,
            Picture(
                id=f"reach-{number}",
                figure=reach_picture(
                    curve.days,
                    [1e3 * u for u in curve.u],
                    {name: [1e3 * u for u in part] for name, part in curve.terms.items()},
                    target_mm=wanted,
                    planned_days=result.costs.days,
                ),
                caption=f"{target.from_end} to {target.to_end}: predicted standard uncertainty if "
                "all sessions were shorter or longer by one factor, and the terms whose squares "
                "add up. What stays level is what limits it.",
                alt=f"u against time, {target.from_end} to {target.to_end}: "
                f"{rounded(1e3 * target.predicted_u)} mm as planned, "
                f"{rounded(1e3 * target.floor_u)} mm with endless time, {rounded(wanted)} mm "
                "wanted",
            ),
        )


def budget_pictures(result: PlanResult) -> Iterator[Picture]:
    """Terms of every target as bars."""
    for number, target in enumerate(result.targets, start=1):
        ends = target.from_end, target.to_end
        lines = [one for one in result.terms if (one.from_end, one.to_end) == ends]
        yield Picture(
            id=f"budget-{number}",
            figure=budget_picture(lines),
            caption=f"What makes up the predicted standard uncertainty, {ends[0]} to {ends[1]}.",
            alt=f"Bars of the budget; the largest term is {lines[0].effect}, "
            f"{rounded(lines[0].height_mm)} mm",
        )


def alternatives_pictures(result: PlanResult) -> Iterator[Picture]:
    """Other techniques against distance; nothing where no target lies between sites."""
    if result.techniques is None:
        return
    curves = result.techniques
    yield Picture(
        id="alternatives",
        figure=alternatives_picture(
            [d / 1e3 for d in curves.distance],
            {
                "spirit levelling": [1e3 * u for u in curves.levelling],
                "GNSS and geoid": [1e3 * u for u in curves.gnss_geoid],
                "clocks, as planned": [1e3 * u for u in curves.clocks],
            },
            pairs={
                f"{one.from_end} to {one.to_end}": (one.distance / 1e3, 1e3 * one.u_clock)
                for one in result.alternatives
            },
        ),
        caption="Standard uncertainty of a height difference against distance. Where the line of "
        "levelling crosses that of the clocks, both are equally good.",
        alt="; ".join(
            f"{one.from_end} to {one.to_end}, {one.distance / 1e3:.0f} km: clocks "
            f"{rounded(1e3 * one.u_clock)} mm, levelling {rounded(1e3 * one.u_levelling)} mm, "
            f"GNSS and geoid {rounded(1e3 * one.u_gnss_geoid)} mm"
            for one in result.alternatives
        ),
    )
