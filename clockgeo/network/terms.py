"""Terms of a datum or geoid model: what they are counted from, and their entries in the rows."""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.gravity import normal_gravity
from clockgeo.levelling.linear_model import ModelBuilder, Named
from clockgeo.network.columns import Columns
from clockgeo.network.datum_plane import ways_from
from clockgeo.network.points import Points
from clockgeo.network.tables import TermSettings
from clockgeo.network.unknowns import Term

__all__ = ["TermFrame", "add_priors", "listed_points", "term_entries", "term_frame"]


@dataclass(frozen=True, eq=False)
class TermFrame:
    """What the terms of a datum or geoid model are counted from, and its points.

    Attributes
    ----------
    id : str
        Of the datum or geoid model.
    origin : (float, float)
        Latitude and longitude in degrees.
    gravity : float
        Normal gravity at the origin, which turns m² s⁻² into m.
    terms : tuple of str
    points : int array, shape (m,)
        Places in the list of points.
    north, east : float array, shape (m,)
        Ways from the origin in m.
    values : float array, shape (m,)
        Geopotential numbers as published or observed, m² s⁻².
    rows : tuple of str, length m
        Ids of the observations.
    """

    id: str
    origin: tuple[float, float]
    gravity: float
    terms: tuple[Term, ...]
    points: NDArray[np.int64]
    north: NDArray[np.float64]
    east: NDArray[np.float64]
    values: NDArray[np.float64]
    rows: tuple[str, ...]

    @property
    def sizes(self) -> dict[Term, NDArray[np.float64] | float]:
        """How much of each term a point has: 1 for the offset, ways and heights in m."""
        return {
            "offset": 1.0,
            "tilt_north": self.north,
            "tilt_east": self.east,
            "elevation": self.values / self.gravity,
            "distance": np.hypot(self.north, self.east),
        }


def term_frame(
    name: str,
    stated_origin: tuple[float, float] | None,
    settings: TermSettings,
    points: Points,
    places: NDArray[np.int64],
    values: NDArray[np.float64],
    rows: tuple[str, ...],
) -> TermFrame:
    """Frame of a table's points; its origin is the middle of the points if none is stated."""
    latitude, longitude = points.latitude[places], points.longitude[places]
    origin = stated_origin or _middle(latitude, longitude)
    north, east = ways_from(origin, latitude, longitude)
    gravity = float(normal_gravity(origin[0]))
    terms = tuple(settings.asked())
    return TermFrame(name, origin, gravity, terms, places, north, east, values, rows)


def _middle(latitude: NDArray[np.float64], longitude: NDArray[np.float64]) -> tuple[float, float]:
    """Mean place, also across the antimeridian, to four decimals so that it can be printed."""
    turn = (longitude - longitude[0] + 180.0) % 360.0 - 180.0
    middle = (float(longitude[0] + turn.mean()) + 180.0) % 360.0 - 180.0
    return round(float(latitude.mean()), 4), round(middle, 4)


def term_entries(frame: TermFrame, names: Mapping[Term, Hashable]) -> list[Named]:
    """Entries -1, -north, -east ... of the terms in the rows of the frame."""
    return [(name, -np.asarray(frame.sizes[term])) for term, name in names.items()]


def add_priors(
    builder: ModelBuilder,
    settings: TermSettings,
    names: Mapping[Term, Hashable],
    gravity: float,
) -> None:
    """Add what is known of terms beforehand as observations of them, in m² s⁻² (a metre)."""
    for term, prior in settings.asked().items():
        if prior is not None:
            builder.observe(
                f"prior: {names[term]}",
                kind="prior",
                value=prior.value * gravity,
                on={names[term]: 1.0},
                variance=(prior.u * gravity) ** 2,
            )


def listed_points(columns: Columns, points: Points, where: str) -> NDArray[np.int64]:
    """Places of the points of a table, each of which may be listed once."""
    if not len(columns):
        raise DataError(
            "the table has no point", where=where, advice="Give heights, a file, or leave it out"
        )
    places = points.places(columns, "point")
    _, first = np.unique(places, return_index=True)
    again = np.ones(places.size, dtype=bool)
    again[first] = False
    columns.refuse(again, "the point is listed before", key="point")
    return places
