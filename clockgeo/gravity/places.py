"""Latitudes, longitudes and heights, checked in one place before anything is computed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError

__all__ = [
    "Place",
    "checked_gravity",
    "checked_height",
    "checked_latitude",
    "checked_longitude",
    "plain",
]

_LOWEST, _HIGHEST = -12_000.0, 9_000.0  # m: below the deepest hole, above the highest peak


@dataclass(frozen=True)
class Place:
    """A point by its geodetic coordinates.

    Attributes
    ----------
    latitude, longitude : float
        Degrees, north and east positive.
    ellipsoidal_height : float
        m.

    Raises
    ------
    DataError
        If a coordinate is out of range.
    """

    latitude: float
    longitude: float
    ellipsoidal_height: float = 0.0

    def __post_init__(self) -> None:
        checked_latitude(self.latitude)
        checked_longitude(self.longitude)
        checked_height(self.ellipsoidal_height)


def checked_latitude(latitude: ArrayLike) -> NDArray[np.float64]:
    """Geodetic latitudes in degrees as float64.

    Raises
    ------
    DataError
        If one is not finite or lies outside -90..90.
    """
    return _within(
        latitude,
        -90.0,
        90.0,
        what="latitude out of range",
        allowed="Geodetic latitude in degrees, -90 to 90, north positive",
        advice="Check whether latitude and longitude are swapped, or the angle is not in degrees",
    )


def checked_longitude(longitude: ArrayLike) -> NDArray[np.float64]:
    """Longitudes in degrees as float64, -180..180 or 0..360, as they were given.

    Raises
    ------
    DataError
        If one is not finite or lies outside -180..360.
    """
    return _within(
        longitude,
        -180.0,
        360.0,
        what="longitude out of range",
        allowed="Longitude in degrees, -180 to 360, east positive",
        advice="Check the unit of the angle and its sign",
    )


def checked_height(height: ArrayLike) -> NDArray[np.float64]:
    """Heights in m of places a clock can stand at, as float64.

    Raises
    ------
    DataError
        If one is not finite or lies outside -12 000..9 000 m, as heights in feet often do.
    """
    return _within(
        height,
        _LOWEST,
        _HIGHEST,
        what="height out of range",
        allowed="Heights in metres, -12 000 to 9 000",
        advice="If the value is in feet, multiply it by 0.3048; if in millimetres, divide by 1000",
    )


def checked_gravity(gravity: ArrayLike) -> NDArray[np.float64]:
    """Gravity in m s⁻² as float64.

    Raises
    ------
    DataError
        If one is not finite or lies outside 9.7..9.9 m s⁻², as values in Gal or mGal do.
    """
    return _within(
        gravity,
        9.7,
        9.9,
        what="gravity out of range",
        allowed="Gravity at the Earth's surface in m s⁻², 9.7 to 9.9",
        advice="If the value is in mGal, multiply it by 1e-5; if in Gal, by 0.01",
    )


def plain(value: ArrayLike) -> float | NDArray[np.float64]:
    """Give a 0-d array back as float, anything else as array: scalar in, scalar out."""
    array = np.asarray(value, dtype=np.float64)
    return float(array) if array.ndim == 0 else array


def _within(
    given: ArrayLike, low: float, high: float, *, what: str, allowed: str, advice: str
) -> NDArray[np.float64]:
    values = np.asarray(given, dtype=np.float64)
    bad = ~((values >= low) & (values <= high))
    if np.any(bad):
        count, first = int(np.count_nonzero(bad)), float(np.extract(bad, values)[0])
        place = f"{count} of {values.size} values" if values.size > 1 else None
        raise DataError(what, value=first, where=place, allowed=allowed, advice=advice)
    return values
