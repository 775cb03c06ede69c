"""The pictures of an adjust page, each with its caption and words for those who cannot see it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from clockgeo.campaign.adjust_results import AdjustResult, DatumResult
from clockgeo.network.datum_plane import ways_from
from clockgeo.report.numbers import typeset, with_uncertainty
from clockgeo.report.page import Picture
from clockgeo.report.pictures.adjustment import (
    DatumOffset,
    PlanePoint,
    datum_picture,
    observation_picture,
    plane_picture,
)
from clockgeo.report.pictures.net import NetPoint, net_picture
from clockgeo.report.pictures.places import Background, map_extent

__all__ = ["datum_pictures", "net_pictures", "observation_pictures", "plane_pictures"]

_LATTICE = 30
_MOST_POINTS = 400
"""A plane's picture shows at most so many points, those with the largest residuals."""


def net_pictures(result: AdjustResult) -> Iterator[Picture]:
    """The network on a map."""
    if not result.points:
        return
    sites = {site.id for site in result.sites}
    points = [
        NetPoint(p.id, p.latitude, p.longitude, p.id in sites, p.geopotential_number is not None)
        for p in result.points
    ]
    suspects = {suspect.id for suspect in result.blunders.suspects}
    between = [
        (o.id, (o.points[0], o.points[1])) for o in result.observations if len(o.points) == 2
    ]
    yield Picture(
        id="net",
        figure=net_picture(
            points,
            [ends for _, ends in between],
            [ends for name, ends in between if name in suspects],
        ),
        caption="Points of the network, and between which of them differences were observed.",
        alt=f"Map of {len(points)} points with {len(between)} observed differences, "
        f"{len(suspects)} suspected",
    )


def datum_pictures(result: AdjustResult) -> Iterator[Picture]:
    """Offsets of all datums."""
    if result.datums:
        yield Picture(
            id="datum-offsets",
            figure=datum_picture([DatumOffset(_name(d), d.offset, d.u) for d in result.datums]),
            caption="Offset of every datum at its origin, ± u thick, ± 2 u thin; positive where "
            "its zero surface lies high.",
            alt="; ".join(f"{_name(d)}: {offset_words(d)}" for d in result.datums),
        )


def plane_pictures(result: AdjustResult) -> Iterator[Picture]:
    """The plane of every datum, with the residuals of its published heights."""
    places = {point.id: (point.latitude, point.longitude) for point in result.points}
    for number, datum in enumerate(result.datums, start=1):
        published = [
            o
            for o in result.observations
            if o.kind == "published" and o.group == datum.id and o.points[0] in places
        ]
        if not published:
            continue
        largest = sorted(published, key=lambda o: -abs(o.residual))[:_MOST_POINTS]
        points = [
            PlanePoint(
                name=o.points[0],
                latitude=places[o.points[0]][0],
                longitude=places[o.points[0]][1],
                residual=o.residual / datum.origin_gravity,
                u=o.u / datum.origin_gravity,
            )
            for o in largest
        ]
        shown = (
            f", the {len(points)} largest of {len(published)}"
            if len(published) > len(points)
            else ""
        )
        yield Picture(
            id=f"plane-{number}",
            figure=plane_picture(points, _plane(datum, points), title=_name(datum)),
            caption=f"{_name(datum)}: its plane as contour lines, and the residuals of its heights "
            f"as bars{shown}; filled ends point up, hollow ends down, thin lines show u.",
            alt=f"Plane of {_name(datum)}: {offset_words(datum)}; {len(published)} heights",
        )


def _plane(datum: DatumResult, points: list[PlanePoint]) -> Background | None:
    """The plane over the map; None where it is not determined or level."""
    north, east = datum.tilt_north, datum.tilt_east
    if datum.offset is None or north is None or east is None or north == east == 0.0:
        return None
    across = np.array([point.longitude for point in points])
    up = np.array([point.latitude for point in points])
    west, far_east, south, far_north = map_extent(up, across)
    longitude = np.linspace(west, far_east, _LATTICE)
    latitude = np.linspace(max(south, -90.0), min(far_north, 90.0), _LATTICE)
    origin = (datum.origin_latitude, datum.origin_longitude)
    to_north, to_east = ways_from(origin, latitude[:, None], longitude[None, :])
    height = datum.offset + north * to_north + east * to_east
    return Background(latitude, longitude, height, "plane of the datum / m")


def observation_pictures(result: AdjustResult) -> Iterator[Picture]:
    """All observations: how they fit, and how well they are controlled."""
    shown = [o for o in result.observations if o.kind not in ("known", "prior")]
    if shown:
        beyond = [o.id for o in shown if abs(o.standardised or 0.0) > result.blunders.limit]
        yield Picture(
            id="observations",
            figure=observation_picture(shown, limit=result.blunders.limit),
            caption="Each observation: the further left, the less others control it; beyond the "
            "dashed lines it contradicts them.",
            alt=f"{len(shown)} observations; beyond the limit of {result.blunders.limit:.2f}: "
            + (", ".join(beyond[:20]) or "none"),
        )


def offset_words(datum: DatumResult) -> str:
    """The offset of a datum, or that there is none."""
    if datum.offset is None or datum.u is None:
        return "offset not determined by the data"
    return f"offset {typeset(with_uncertainty(datum.offset, datum.u, 'm'))}"


def _name(datum: DatumResult) -> str:
    return datum.name or datum.id
