"""Levelled lines and tide gauges as rows of the linear model; what all row makers share.

levelled line     ΔC + v = C_to - C_from
tide gauge        γ (height above mean sea + dynamic topography) + v = C
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Hashable, Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import TideSystem, normal_gravity, tide_system_shift
from clockgeo.levelling.effects import EffectKey
from clockgeo.levelling.linear_model import ModelBuilder, Named
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.columns import Columns, from_rows, read_columns
from clockgeo.network.points import Points
from clockgeo.network.tables import Levelling, TideGauge

__all__ = [
    "add_levelling",
    "add_tide_gauges",
    "agreed_tide_system",
    "line_columns",
    "numbers_at",
]

LINE_TEXTS = ("id", "from", "to")
LINE_NUMBERS = (
    "height_difference",
    "gravity",
    "geopotential_difference",
    "u",
    "length",
)


def numbers_at(points: Points, places: NDArray[np.int64]) -> list[Hashable]:
    """Names of the unknown geopotential numbers at places in the list of points."""
    return [NumberOf(points.ids[place]) for place in places]


def agreed_tide_system(
    stated: TideSystem, wanted: TideSystem, *, convert: bool, where: str
) -> None:
    """Refuse a table in another tide system than the campaign's unless its conversion is asked for.

    Raises
    ------
    ConventionError
        If the systems differ and `convert` is false.
    """
    if stated is not wanted and not convert:
        raise ConventionError(
            f"tide systems do not agree: {where} is {stated}, the campaign is {wanted}",
            advice="Correct what is stated, or set convert_tide_system = true there",
        )


def line_columns(levelling: Levelling, read: str | None) -> Columns:
    """Lines of a levelling from its file (`read` is its path) or its rows."""
    if read is not None:
        return read_columns(read, texts=LINE_TEXTS, numbers=LINE_NUMBERS, required=("from", "to"))
    return from_rows(
        levelling.lines,
        source=f"[[levelling]] {levelling.id}",
        texts=LINE_TEXTS,
        numbers=LINE_NUMBERS,
    )


def add_levelling(
    builder: ModelBuilder,
    levelling: Levelling,
    columns: Columns,
    points: Points,
    *,
    tide_system: TideSystem,
) -> list[str]:
    """Add the lines of one levelling.

    Parameters
    ----------
    builder : ModelBuilder
    levelling : Levelling
    columns : Columns
        Its lines, see `line_columns`.
    points : Points
    tide_system : TideSystem
        Of the campaign.

    Returns
    -------
    list of str
        Ids of the rows.

    Raises
    ------
    DataError
        If there are no lines, a line has no difference, no gravity or no u, leads to its own start,
        repeats another one, or names an unknown point.
    ConventionError
        If the tide system is another one and its conversion was not asked for.
    """
    where = f"[[levelling]] {levelling.id}"
    agreed_tide_system(
        levelling.tide_system, tide_system, convert=levelling.convert_tide_system, where=where
    )
    if not len(columns):
        raise DataError("a levelling has no lines", where=where, advice="Give lines or a file")
    start, end = points.places(columns, "from"), points.places(columns, "to")
    columns.refuse(start == end, "the line leads to its own start", key="from")
    values, per_metre = _differences(columns, points, start, end)
    _refuse_repeated(columns, start, end, values)
    u = _line_uncertainty(levelling, columns, per_metre)
    if levelling.tide_system is not tide_system:
        shift = _tide_shift(points, levelling.tide_system, tide_system)
        values = values + shift[end] - shift[start]
    on: list[Named] = [(numbers_at(points, end), 1.0), (numbers_at(points, start), -1.0)]
    effects: list[Named] = []
    if levelling.u_scale:
        effects = [(EffectKey(levelling.id, "scale of the rods"), levelling.u_scale * values)]
    rows = _line_ids(levelling.id, columns)
    builder.observe_all(rows, kind="levelled", values=values, on=on, effects=effects, variance=u**2)
    return rows


def _differences(
    columns: Columns, points: Points, start: NDArray[np.int64], end: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """ΔC of the lines in m² s⁻², and how much 1 m of height is there."""
    number, height = (
        columns.numbers["geopotential_difference"],
        columns.numbers["height_difference"],
    )
    in_heights = np.isnan(number)
    columns.refuse(
        in_heights & np.isnan(height),
        "neither height_difference nor geopotential_difference is given",
        key="from",
    )
    columns.refuse(
        ~in_heights & ~np.isnan(height), "two differences are given, one is needed", key="from"
    )
    gravity = columns.numbers["gravity"]
    along = np.where(
        np.isnan(gravity), (points.gravity[start] + points.gravity[end]) / 2.0, gravity
    )
    columns.refuse(
        in_heights & np.isnan(along),
        "a height difference has no gravity",
        key="from",
        advice="Give gravity along the line or at both points; normal gravity is not good enough",
    )
    normal = np.asarray(normal_gravity(points.latitude[start]))
    per_metre = np.where(np.isnan(along), normal, along)
    return np.where(in_heights, along * np.where(in_heights, height, 0.0), number), per_metre


def _line_uncertainty(
    levelling: Levelling, columns: Columns, per_metre: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Standard uncertainty of the lines in m² s⁻²."""
    stated, length = columns.numbers["u"], columns.numbers["length"]
    root_km = levelling.root_km
    kilometres = length / 1000.0
    by_length = np.hypot(
        (np.nan if root_km is None else root_km) * np.sqrt(kilometres),
        levelling.u_per_km * kilometres,
    )
    in_heights = np.isnan(columns.numbers["geopotential_difference"])
    own = np.where(in_heights, stated * per_metre, stated)
    u = np.where(np.isnan(stated), by_length * per_metre, own)
    columns.refuse(
        np.isnan(u),
        "the line has no u",
        key="from",
        advice="Give u, or a length with class or u_per_root_km",
    )
    columns.refuse(~(u > 0.0), "u of the line is not positive", key="from")
    return u


def _refuse_repeated(
    columns: Columns,
    start: NDArray[np.int64],
    end: NDArray[np.int64],
    values: NDArray[np.float64],
) -> None:
    """Refuse a line that is there twice, also run the other way; repeated work differs in value."""
    turned = start > end
    key = np.stack(
        [np.minimum(start, end), np.maximum(start, end), np.where(turned, -values, values)], axis=1
    )
    _, first = np.unique(key, axis=0, return_index=True)
    again = np.ones(start.size, dtype=bool)
    again[first] = False
    columns.refuse(
        again,
        "the line with the same value is there before",
        key="from",
        advice="Leave out the copy; a repeated levelling has a value of its own",
    )


def _line_ids(levelling: str, columns: Columns) -> list[str]:
    stated, start, end = (columns.texts[name] for name in LINE_TEXTS)
    names = [
        f"{levelling}: {one or f'{a} to {b}'}" for one, a, b in zip(stated, start, end, strict=True)
    ]
    count: Counter[str] = Counter()
    unique = []
    for name in names:
        count[name] += 1
        unique.append(name if count[name] == 1 else f"{name} ({count[name]})")
    return unique


def _tide_shift(points: Points, source: TideSystem, target: TideSystem) -> NDArray[np.float64]:
    shift = tide_system_shift("geopotential_number", points.latitude, source=source, target=target)
    return np.asarray(shift)


def add_tide_gauges(
    builder: ModelBuilder, gauges: Sequence[TideGauge], points: Points
) -> list[str]:
    """Add the ties of tide gauges; returns the ids of the rows.

    Notes
    -----
    Mean sea level is where the sea surface is on average, the permanent tide included; the dynamic
    topography must be stated above the campaign's zero level and in its tide system.
    """
    if not gauges:
        return []
    columns = from_rows(gauges, source="[[tide_gauge]]", texts=("point",), numbers=())
    places = points.places(columns, "point")
    gravity = np.asarray(normal_gravity(points.latitude[places]))
    height = np.array([g.height_above_mean_sea + g.dynamic_topography for g in gauges])
    u = np.array([np.hypot(g.u_height_above_mean_sea, g.u_dynamic_topography) for g in gauges])
    columns.refuse(~(u > 0.0), "u of the tide gauge is not positive", key="point")
    rows = [f"tide gauge: {gauge.point}" for gauge in gauges]
    builder.observe_all(
        rows,
        kind="tide_gauge",
        values=gravity * height,
        on=[(numbers_at(points, places), 1.0)],
        variance=(gravity * u) ** 2,
    )
    return rows
