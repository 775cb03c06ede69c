"""What a grid file says: its tiles, and whatever conventions it states."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from fractions import Fraction

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError
from clockgeo.gravity.grid_tile import GridTile

__all__ = ["CONVENTIONS", "GridContent", "first_wins", "tile_of"]

CONVENTIONS = (
    "quantity",
    "tide_system",
    "zero_level",
    "zero_level_potential",
    "ellipsoid",
    "interpolation",
    "u",
    "correlation_length",
    "epoch",
    "model_type",
    "fitted_to",
)
"""Names of the attributes that hold conventions; the same in netCDF, GGXF and in messages."""

_LARGEST = 120.0  # m; the geoid stays within 107 m of the ellipsoid


@dataclass(frozen=True, eq=False)
class GridContent:
    """Tiles of a file and the conventions it states; a key that is absent is not stated.

    Attributes
    ----------
    format : str
        Name of the file format.
    tiles : tuple of GridTile
        Sorted; the first that holds a point wins.
    stated : dict of str to str
        Any of `CONVENTIONS`, and `source`.
    """

    format: str
    tiles: tuple[GridTile, ...]
    stated: dict[str, str] = field(default_factory=dict)


def first_wins(tiles: Sequence[GridTile]) -> tuple[GridTile, ...]:
    """Sort the tiles of a nest by precedence: deepest, highest priority, finest."""
    return tuple(sorted(tiles, key=lambda tile: tile.precedence))


def tile_of(
    latitude: ArrayLike,
    longitude: ArrayLike,
    values: ArrayLike,
    *,
    where: str,
    u: ArrayLike | None = None,
    rate: ArrayLike | None = None,
    name: str = "",
    depth: int = 0,
    priority: int = 0,
) -> GridTile:
    """Make a tile of node coordinates in any direction and of values on them.

    Parameters
    ----------
    latitude : array, shape (R,)
        Node latitudes in degrees, evenly spaced, ascending or descending.
    longitude : array, shape (C,)
        Node longitudes in degrees, evenly spaced; may run 0..360, -180..180 or across 180.
    values, u, rate : array, shape (R, C)
        m, m, m a year; NaN for no data.
    where : str
        File and field, for messages.
    name, depth, priority
        See `GridTile`.

    Raises
    ------
    DataError
        If the axes are not evenly spaced, out of range, swapped, or do not fit the values, or the
        values are too large for metres.

    Notes
    -----
    A column that repeats the first one after a full turn is taken off. Axes in single precision
    are read as the rational number of degrees that their rounding allows, if there is one.
    """
    phi, lam = (_floating(axis) for axis in (latitude, longitude))
    fields = [None if f is None else np.asarray(f) for f in (values, u, rate)]
    assert fields[0] is not None
    shape = fields[0].shape
    if shape != (phi.size, lam.size) or min(shape) < 2:
        raise DataError(
            "the grid's values do not fit its axes",
            value=f"shape {shape} for {phi.size} latitudes and {lam.size} longitudes",
            where=where,
            allowed="At least 2 nodes along each axis",
        )
    south, latitude_step = _regular(phi, "latitudes", where)
    west, longitude_step = _regular(_unwrapped(lam), "longitudes", where)
    if latitude_step < 0.0:
        south += latitude_step * (phi.size - 1)
        fields = [None if f is None else f[::-1] for f in fields]
    if longitude_step < 0.0:
        west += longitude_step * (lam.size - 1)
        fields = [None if f is None else f[:, ::-1] for f in fields]
    latitude_step, longitude_step = abs(latitude_step), abs(longitude_step)
    _check_axes((south, latitude_step, phi.size), (west, longitude_step, lam.size), where)
    fields = _without_seam(fields, 360.0 / longitude_step, where)
    heights, spread, change = (None if f is None else np.ascontiguousarray(f) for f in fields)
    assert heights is not None
    _check_values(heights, where)
    return GridTile(
        south,
        west if -180.0 <= west < 180.0 else (west + 180.0) % 360.0 - 180.0,
        latitude_step,
        longitude_step,
        heights,
        u=spread,
        rate=change,
        name=name,
        depth=depth,
        priority=priority,
    )


def _floating(axis: ArrayLike) -> NDArray[np.floating]:
    """Coordinates in the precision they are stored in, whole numbers as float64."""
    array = np.asarray(axis)
    return array if array.dtype.kind == "f" else array.astype(np.float64)


def _unwrapped(longitude: NDArray[np.floating]) -> NDArray[np.floating]:
    """Longitudes without a jump at the antimeridian, in their own precision."""
    if not np.all(np.isfinite(longitude)):
        return longitude
    return np.unwrap(longitude, period=360.0).astype(longitude.dtype)


def _regular(axis: NDArray[np.floating], name: str, where: str) -> tuple[float, float]:
    """First value and signed step of an evenly spaced axis."""
    places = axis.astype(np.float64)
    if places.ndim != 1 or not np.all(np.isfinite(places)):
        raise DataError(f"the grid's {name} are not finite numbers along one axis", where=where)
    first, step = float(places[0]), float(places[-1] - places[0]) / (places.size - 1)
    rounding = _rounding(axis)
    worst = float(np.max(np.abs(places - (first + step * np.arange(places.size)))))
    if step == 0.0 or worst > 2.0 * rounding + 1e-5 * abs(step):
        steps = np.diff(places)
        raise DataError(
            f"the grid's {name} are not evenly spaced",
            value=f"steps from {steps.min():g} to {steps.max():g} degrees",
            where=where,
            advice="Resample the model to a regular grid",
        )
    return _as_meant(first, rounding), _as_meant(step, 2.0 * rounding / (places.size - 1))


def _rounding(axis: NDArray[np.floating]) -> float:
    """Largest rounding error of a stored axis: 1.5e-5 degrees at 360 in single precision."""
    largest = float(np.max(np.abs(axis.astype(np.float64))))
    return 0.5 * float(np.finfo(axis.dtype).eps) * max(largest, 1.0)


def _as_meant(stored: float, rounding: float) -> float:
    """The fraction with a denominator up to 7200 (half a second of arc) within the rounding."""
    simple = Fraction(stored).limit_denominator(7200)
    return float(simple) if abs(float(simple) - stored) <= rounding else stored


def _check_axes(
    latitudes: tuple[float, float, int], longitudes: tuple[float, float, int], where: str
) -> None:
    south, latitude_step, rows = latitudes
    north = south + latitude_step * (rows - 1)
    if south < -90.0 - 1e-6 or north > 90.0 + 1e-6:
        raise DataError(
            "the grid's latitudes are out of range",
            value=f"{south:g} to {north:g}",
            where=where,
            allowed="-90 to 90 degrees",
            advice="Perhaps the axes are swapped",
        )
    west, longitude_step, columns = longitudes
    east = west + longitude_step * (columns - 1)
    if west < -360.0 - 1e-6 or east > 720.0 or east - west > 360.0 + 1e-3 * longitude_step:
        raise DataError(
            "the grid's longitudes are out of range",
            value=f"{west:g} to {east:g}",
            where=where,
            allowed="At most one turn of 360 degrees, from -180 or from 0",
        )


def _check_values(values: NDArray[np.floating], where: str) -> None:
    with np.errstate(invalid="ignore"):
        largest = float(np.nanmax(np.abs(values), initial=0.0))
    if largest > _LARGEST:
        raise DataError(
            "the grid's values are too large for geoid heights in metres",
            value=f"{largest:g}",
            where=where,
            allowed="-120 to 120 m",
            advice="Check the unit, and the value that stands for missing data",
        )
    if not np.any(np.isfinite(values)):
        raise DataError("the grid holds no value at all", where=where)


def _without_seam(
    fields: list[NDArray[np.floating] | None], turn: float, where: str
) -> list[NDArray[np.floating] | None]:
    """Drop the column that repeats the first one in a grid that goes round."""
    values = fields[0]
    assert values is not None
    if abs(values.shape[1] - 1 - turn) > 1e-3:
        return fields
    apart = np.abs(values[:, 0].astype(np.float64) - values[:, -1])
    if np.any(apart > 1e-3):
        raise DataError(
            "the first and the last column are one meridian but differ",
            value=f"by {np.nanmax(apart):.3g} m",
            where=where,
        )
    return [None if f is None else f[:, :-1] for f in fields]
