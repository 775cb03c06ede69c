"""Published heights as rows of the linear model, with the terms of their datum.

    C_pub + v = C - [o + n·north + e·east + h·H + s·distance]

so that an offset o = W0 - W0_datum is positive where the datum's zero surface lies high. Ways are
those of EPSG method 1046 from the origin; offsets are in m² s⁻², the other terms in m² s⁻² a metre.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.gravity import (
    TideSystem,
    convert_tide_system,
    normal_gravity,
    number_of_dynamic_height,
    number_of_normal_height,
    number_of_orthometric_height,
)
from clockgeo.gravity.heights import DYNAMIC_GRAVITY, HELMERT_GRADIENT
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.network.columns import Columns, from_rows, read_columns
from clockgeo.network.identifiability import listed
from clockgeo.network.observations import agreed_tide_system, numbers_at
from clockgeo.network.points import Points
from clockgeo.network.tables import Datum
from clockgeo.network.terms import TermFrame, add_priors, listed_points, term_entries, term_frame
from clockgeo.network.unknowns import DatumTerm, Term

__all__ = ["add_datum", "datum_columns", "refuse_points_in_two_datums"]

DATUM_NUMBERS = ("height", "geopotential_number", "u")


def datum_columns(datum: Datum, read: str | None) -> Columns:
    """Published heights of a datum from its file (`read` is its path) or its rows."""
    if read is not None:
        return read_columns(read, texts=("point",), numbers=DATUM_NUMBERS, required=("point",))
    where = f"[[datum]] {datum.id}"
    return from_rows(datum.heights, source=where, texts=("point",), numbers=DATUM_NUMBERS)


def refuse_points_in_two_datums(columns: Mapping[str, Columns], shared: Sequence[str] = ()) -> None:
    """Refuse an id under which two datums publish a height, unless it is `shared` on purpose.

    Raises
    ------
    DataError
        With the ids and the datums.
    """
    home: dict[str, str] = {}
    twice: dict[str, str] = {}
    for datum, table in columns.items():
        for point in map(str, table.texts["point"]):
            other = home.setdefault(point, datum)
            if other != datum and point not in shared:
                twice[point] = f"{point} (in {other} and {datum})"
    if twice:
        raise DataError(
            "points stand in two datums under one id",
            value=listed(twice.values()),
            advice="If it is one mark, name it in shared_points of [network]; else rename one",
        )


def add_datum(
    builder: ModelBuilder,
    datum: Datum,
    columns: Columns,
    points: Points,
    *,
    tide_system: TideSystem,
) -> TermFrame:
    """Add the published heights of a datum.

    Raises
    ------
    DataError
        If the datum has no point, a point is listed twice or unknown, or a value, its u or the
        gravity that it needs is missing.
    ConventionError
        If the tide system is another one and its conversion was not asked for.
    """
    where = f"[[datum]] {datum.id}"
    agreed_tide_system(
        datum.tide_system, tide_system, convert=datum.convert_tide_system, where=where
    )
    places = listed_points(columns, points, where)
    values, per_metre = _published_numbers(datum, columns, points, places, tide_system)
    given = columns.filled("u", datum.u)
    columns.refuse(np.isnan(given), "the height has no u", key="point", advice="Give u")
    columns.refuse(~(given > 0.0), "u of the height is not positive", key="point")
    u = given * (1.0 if datum.kind == "geopotential" else per_metre)
    stated = None if datum.origin is None else (datum.origin.latitude, datum.origin.longitude)
    rows = tuple(f"{datum.id}: {name}" for name in columns.texts["point"])
    frame = term_frame(datum.id, stated, datum.terms, points, places, values, rows)
    names: dict[Term, Hashable] = {term: DatumTerm(datum.id, term) for term in frame.terms}
    on = [(numbers_at(points, places), 1.0), *term_entries(frame, names)]
    builder.observe_all(list(rows), kind="published", values=values, on=on, variance=u**2)
    add_priors(builder, datum.terms, names, frame.gravity)
    return frame


def _published_numbers(
    datum: Datum,
    columns: Columns,
    points: Points,
    places: NDArray[np.int64],
    tide_system: TideSystem,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Published values as numbers in m² s⁻² and in the campaign's tide system; and dC/dH."""
    in_numbers = datum.kind == "geopotential"
    name, other = ("geopotential_number", "height")[:: 1 if in_numbers else -1]
    given = columns.numbers[name]
    columns.refuse(
        np.isnan(given) | ~np.isnan(columns.numbers[other]),
        f"a datum of kind {datum.kind} needs {name} and no {other}",
        key="point",
    )
    latitude = points.latitude[places]
    value = np.asarray(
        convert_tide_system(
            given,
            latitude,
            quantity="geopotential_number" if in_numbers else "physical_height",
            source=datum.tide_system,
            target=tide_system,
        )
    )
    if in_numbers:
        return value, np.asarray(normal_gravity(latitude))
    if datum.kind == "normal":
        number, slope = number_of_normal_height(value, latitude), normal_gravity(latitude, value)
    elif datum.kind == "dynamic":
        number, slope = number_of_dynamic_height(value), DYNAMIC_GRAVITY.value
    else:
        gravity = points.gravity[places]
        columns.refuse(
            np.isnan(gravity),
            "an orthometric height has no gravity at its point",
            key="point",
            advice="Give gravity among the points",
        )
        number = number_of_orthometric_height(value, gravity)
        slope = gravity + 2.0 * HELMERT_GRADIENT.value * value
    return np.asarray(number), np.broadcast_to(np.asarray(slope), value.shape)
