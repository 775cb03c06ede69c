"""From an adjustment to the tables of points, pairs, datums and geoid models."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.adjust_results import (
    DatumResult,
    Epsg1046Result,
    GeoidResult,
    PairResult,
    PointResult,
)
from clockgeo.campaign.networking import NetworkRows
from clockgeo.campaign.schema import Campaign
from clockgeo.gravity import CAUTION, normal_height, zero_level
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.adjustment import Adjustment
from clockgeo.network.epsg1046 import OffsetAndSlope, write_wkt
from clockgeo.network.points import Points
from clockgeo.network.tables import Datum
from clockgeo.network.terms import TermFrame
from clockgeo.network.unknowns import DatumTerm, GeoidTerm, Term

__all__ = ["datum_results", "geoid_results", "pair_results", "point_results"]

Pair = tuple[float | None, float | None]
"""Value and u; None twice where the observations do not determine it."""


def point_results(adjustment: Adjustment, points: Points) -> Iterator[PointResult]:
    """Number and normal height of every point, in the order of the list of points."""
    u = adjustment.u_of_unknowns
    for place, name in enumerate(points.ids):
        latitude, longitude = float(points.latitude[place]), float(points.longitude[place])
        column = adjustment.place.get(NumberOf(name))
        number, u_number = (None, None) if column is None else _known(adjustment, u, column)
        yield PointResult(
            id=name,
            latitude=latitude,
            longitude=longitude,
            geopotential_number=number,
            u=u_number,
            normal_height=None if number is None else float(normal_height(number, latitude)),
        )


def _known(adjustment: Adjustment, u: NDArray[np.float64], column: int) -> Pair:
    if not np.isfinite(u[column]):
        return None, None
    return float(adjustment.estimate[column]), float(u[column])


def pair_results(adjustment: Adjustment, pairs: Sequence[tuple[str, str]]) -> Iterator[PairResult]:
    """Difference of pairs of points, second minus first."""
    for first, second in pairs:
        combination = {NumberOf(second): 1.0, NumberOf(first): -1.0}
        here = all(name in adjustment.place for name in combination)
        estimable = here and adjustment.estimable(combination)
        yield PairResult(
            from_point=first,
            to_point=second,
            geopotential_difference=adjustment.value(combination) if estimable else None,
            u=adjustment.u(combination) if estimable else None,
        )


def datum_results(
    campaign: Campaign, adjustment: Adjustment, rows: NetworkRows
) -> Iterator[DatumResult]:
    """Offset, tilts and hand-over of every datum."""
    for datum in campaign.datums:
        frame = rows.datums[datum.id]
        names: dict[Term, DatumTerm] = {term: DatumTerm(datum.id, term) for term in frame.terms}
        terms = _terms(adjustment, frame, names)
        offset, u_offset = terms["offset"]
        yield DatumResult(
            id=datum.id,
            name=datum.name or datum.id,
            kind=datum.kind,
            points=len(frame.rows),
            offset=offset,
            u=u_offset,
            offset_potential=None if offset is None else offset * frame.gravity,
            u_offset_potential=None if u_offset is None else u_offset * frame.gravity,
            offset_above_height_reference=_above_reference(campaign, frame, offset),
            tilt_north=terms["tilt_north"][0],
            tilt_east=terms["tilt_east"][0],
            u_tilt_north=terms["tilt_north"][1],
            u_tilt_east=terms["tilt_east"][1],
            elevation_term=terms["elevation"][0],
            u_elevation_term=terms["elevation"][1],
            distance_term=terms["distance"][0],
            u_distance_term=terms["distance"][1],
            origin_latitude=frame.origin[0],
            origin_longitude=frame.origin[1],
            origin_gravity=frame.gravity,
            epsg_1046=_hand_over(campaign, datum, frame, rows.points, terms),
        )


def _terms(
    adjustment: Adjustment, frame: TermFrame, names: Mapping[Term, DatumTerm | GeoidTerm]
) -> dict[Term, Pair]:
    """Terms in m and m a metre with u: 0 where not asked for, None where not determined."""
    every: tuple[Term, ...] = ("offset", "tilt_north", "tilt_east", "elevation", "distance")
    found: dict[Term, Pair] = dict.fromkeys(every, (0.0, 0.0))
    for term, name in names.items():
        pair = _known(adjustment, adjustment.u_of_unknowns, adjustment.place[name])
        value, u = (None if one is None else one / frame.gravity for one in pair)
        found[term] = value, u
    return found


def _above_reference(campaign: Campaign, frame: TermFrame, offset: float | None) -> float | None:
    """Offset against the zero level of the height reference, in m."""
    own, reference = zero_level(campaign.head.zero_level).w0, zero_level("height_reference").w0
    if offset is None or own is None or reference is None:
        return None
    return offset + (reference - own) / frame.gravity


def _hand_over(
    campaign: Campaign,
    datum: Datum,
    frame: TermFrame,
    points: Points,
    terms: Mapping[Term, Pair],
) -> Epsg1046Result | None:
    """The datum's plane as parameters that other software reads; None where it has gaps."""
    values = {term: value for term, (value, _) in terms.items()}
    offset, north, east = values["offset"], values["tilt_north"], values["tilt_east"]
    if offset is None or north is None or east is None:
        return None
    operation = OffsetAndSlope.from_tilts(frame.origin, offset, north, east)
    level = zero_level(campaign.head.zero_level)
    head = campaign.head
    wkt = write_wkt(
        operation,
        source=datum.name or datum.id,
        target=f"{level.name} zero level of {head.name}",
        accuracy=terms["offset"][1] or None,
        remark=f"Tide system {head.tide_system.value}. {CAUTION}",
    )
    return Epsg1046Result(
        latitude=operation.latitude,
        longitude=operation.longitude,
        vertical_offset=operation.offset,
        inclination_in_latitude=operation.inclination_latitude,
        inclination_in_longitude=operation.inclination_longitude,
        largest_departure=_largest_departure(frame, points, operation, values),
        wkt=wkt,
    )


def _largest_departure(
    frame: TermFrame,
    points: Points,
    operation: OffsetAndSlope,
    terms: Mapping[Term, float | None],
) -> float:
    """Largest difference between the plane and the correction by geopotential numbers, m."""
    latitude, longitude = points.latitude[frame.points], points.longitude[frame.points]
    step = frame.gravity * sum((terms[term] or 0.0) * size for term, size in frame.sizes.items())
    rigorous = normal_height(frame.values + step, latitude) - normal_height(frame.values, latitude)
    return float(np.max(np.abs(rigorous - operation.shift(latitude, longitude))))


def geoid_results(adjustment: Adjustment, frame: TermFrame | None) -> Iterator[GeoidResult]:
    """Bias and tilts of the geoid model, where there is one in the net."""
    if frame is None:
        return
    names: dict[Term, GeoidTerm] = {term: GeoidTerm(frame.id, term) for term in frame.terms}
    terms = _terms(adjustment, frame, names)
    yield GeoidResult(
        id=frame.id,
        bias=terms["offset"][0],
        u=terms["offset"][1],
        tilt_north=terms["tilt_north"][0],
        tilt_east=terms["tilt_east"][0],
        u_tilt_north=terms["tilt_north"][1],
        u_tilt_east=terms["tilt_east"][1],
    )
