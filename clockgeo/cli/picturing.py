"""From what commands hold in hand to the pictures that --picture asks for."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from clockgeo.frequency import RecordStability, Screening
    from clockgeo.gravity import GeoidModel, TideSeries

__all__ = ["draw_geoid", "draw_screenings", "draw_stability", "draw_tide", "numbered_pictures"]

_LATTICE = 120, 80
"""Longitudes and latitudes at which a grid is sampled for its contour lines."""
_GEOID_SPAN = 0.6
"""Smallest height of a geoid map in degrees: a few nodes of any grid."""
_LABELLED = 30
"""Up to so many points carry their values."""


def numbered_pictures(path: Path | None, count: int, *, replace: bool) -> list[Path]:
    """Names of `count` pictures: the given one, or with -1, -2 ... before its suffix.

    None gives no names, and nothing will be drawn.

    Raises
    ------
    DataError, OutputError
        If one of them could not be written later.
    """
    if path is None:
        return []
    from clockgeo.report import checked_picture

    names = [path.with_name(f"{path.stem}-{n}{path.suffix}") for n in range(1, count + 1)]
    return [checked_picture(name, replace=replace) for name in (names if count > 1 else [path])]


def draw_screenings(
    screenings: Sequence[Screening], paths: Sequence[Path], *, replace: bool
) -> None:
    """Draw every record with its flagged epochs; nothing where there are no paths."""
    if not paths:
        return
    from clockgeo.report import record_picture, save_picture

    for screening, path in zip(screenings, paths, strict=True):
        record = screening.record
        figure = record_picture(
            record.tai_ns,
            record.y,
            screening.reasons,
            interval=record.interval,
            title=record.name,
        )
        save_picture(figure, path, replace=replace)


def draw_stability(
    results: Sequence[RecordStability], paths: Sequence[Path], *, replace: bool
) -> None:
    """Draw the curves of every record with its noise model; nothing where there are no paths."""
    if not paths:
        return
    from clockgeo.frequency.stability_statistics import find_statistic
    from clockgeo.report import save_picture, stability_picture

    for result, path in zip(results, paths, strict=True):
        in_seconds = all(find_statistic(curve.statistic).in_time for curve in result.curves)
        figure = stability_picture(
            result.curves,
            model=None if in_seconds else result.model,
            model_name="noise model, Allan deviation",
            model_from=result.laws.from_seconds if result.laws else 0.0,
            title=result.record.name,
        )
        save_picture(figure, path, replace=replace)


def draw_tide(series: TideSeries, per_potential: float, path: Path, *, replace: bool) -> None:
    """Draw a tide with its u and a scale of fractional frequency."""
    from clockgeo.gravity.tide_model import UNMODELLED_FRACTION
    from clockgeo.report import save_picture, tide_picture

    place = series.site.place
    title = f"Tide at {place.latitude:.4f}°, {place.longitude:.4f}°"
    if series.other is not None:
        other = series.other.place
        title += f" minus {other.latitude:.4f}°, {other.longitude:.4f}°"
    figure = tide_picture(
        series.tai_ns,
        series.potential,
        u=UNMODELLED_FRACTION.value * float(np.max(np.abs(series.potential))),
        per_potential=per_potential,
        title=title,
    )
    save_picture(figure, path, replace=replace)


def draw_geoid(
    model: GeoidModel,
    latitude: NDArray[np.float64],
    longitude: NDArray[np.float64],
    values: NDArray[np.float64],
    u: NDArray[np.float64] | None,
    path: Path,
    *,
    replace: bool,
) -> None:
    """Draw the model around points as contour lines, with the points' values on it."""
    from clockgeo.report import Background, MapSite, map_extent, save_picture, site_map
    from clockgeo.report.numbers import with_uncertainty

    west, east, south, north = map_extent(latitude, longitude, span=_GEOID_SPAN)
    across = np.linspace(west, east, _LATTICE[0])
    up = np.linspace(max(south, -90.0), min(north, 90.0), _LATTICE[1])
    wrapped = (across + 180.0) % 360.0 - 180.0
    field = np.asarray(model.sample(up[:, None], wrapped[None, :], outside="nan"))
    quantity = model.quantity.replace("_", " ")
    sites = []
    for place in range(latitude.size):
        value, spread = float(values[place]), None if u is None else float(u[place])
        known = np.isfinite(value) and (spread is None or np.isfinite(spread))
        note = with_uncertainty(round(value, 4), spread, "m") if known else "no value"
        named = latitude.size <= _LABELLED
        sites.append(
            MapSite(
                name=f"{latitude[place]:.4f}°, {longitude[place]:.4f}°" if named else "",
                latitude=float(latitude[place]),
                longitude=float(longitude[place]),
                note=note if named else "",
            )
        )
    background = Background(up, across, field, f"{quantity} of {model.name} / m")
    title = f"{quantity} above {model.ellipsoid}, {model.tide_system.value.replace('_', ' ')}"
    save_picture(
        site_map(sites, background=background, span=_GEOID_SPAN, title=title), path, replace=replace
    )
