"""The points of a net: sites of the campaign and benchmarks, under one list of ids."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from clockgeo.levelling.stations import Site
from clockgeo.network.columns import Columns

__all__ = ["POINT_NUMBERS", "POINT_TEXTS", "Points", "gather_points"]

POINT_TEXTS = ("id",)
POINT_NUMBERS = ("latitude", "longitude", "gravity")
_SAME_PLACE = 1e-5  # degrees, about a metre


@dataclass(frozen=True, eq=False)
class Points:
    """Points with coordinates.

    Attributes
    ----------
    ids : tuple of str, length N
    latitude, longitude : float array, shape (N,)
        Degrees.
    gravity : float array, shape (N,)
        m s⁻²; NaN where not measured.
    """

    ids: tuple[str, ...]
    latitude: NDArray[np.float64]
    longitude: NDArray[np.float64]
    gravity: NDArray[np.float64]

    @cached_property
    def _place(self) -> dict[str, int]:
        return {name: place for place, name in enumerate(self.ids)}

    def places(self, columns: Columns, key: str) -> NDArray[np.int64]:
        """Places of the points that a column names.

        Raises
        ------
        DataError
            If a name is no point; names the rows, and a similar id.
        """
        names = columns.texts[key]
        found = np.array([self._place.get(name, -1) for name in names], dtype=np.int64)
        unknown = found < 0
        if unknown.any():
            first = str(names[np.flatnonzero(unknown)[0]])
            near = difflib.get_close_matches(first, self.ids, n=1, cutoff=0.6)
            columns.refuse(
                unknown,
                f"{key} is not a point of the net",
                key=key,
                advice=f"Did you mean {near[0]!r}?" if near else "List it among the points",
            )
        return found


def gather_points(sites: Sequence[Site], benchmarks: Columns | None) -> Points:
    """Put sites and benchmarks together; a benchmark may repeat a site at the same place.

    Raises
    ------
    DataError
        If a benchmark is listed twice, lies elsewhere than the site of its id, or is no place.
    """
    ids = [site.id for site in sites]
    latitude = [site.latitude for site in sites]
    longitude = [site.longitude for site in sites]
    gravity = [np.nan if site.gravity is None else site.gravity for site in sites]
    if benchmarks is None:
        return Points(
            tuple(ids), np.array(latitude, float), np.array(longitude, float), np.array(gravity)
        )
    names = benchmarks.texts["id"]
    phi, lam = benchmarks.numbers["latitude"], benchmarks.numbers["longitude"]
    _check_places(benchmarks, phi, lam)
    known = {name: place for place, name in enumerate(ids)}
    known_at = np.array([known.get(name, -1) for name in names], dtype=np.int64)
    repeated = np.flatnonzero(known_at >= 0)
    there = known_at[repeated]
    elsewhere = np.zeros(names.size, dtype=bool)
    if repeated.size:
        turn = (lam[repeated] - np.array(longitude)[there] + 180.0) % 360.0 - 180.0
        off = np.abs(phi[repeated] - np.array(latitude)[there]) + np.abs(turn)
        elsewhere[repeated] = off > _SAME_PLACE
    benchmarks.refuse(
        elsewhere, "lies elsewhere than the site of that id", key="id", advice="Rename one of them"
    )
    new = known_at < 0
    g = benchmarks.numbers["gravity"]
    return Points(
        (*ids, *names[new]),
        np.concatenate([np.array(latitude, float), phi[new]]),
        np.concatenate([np.array(longitude, float), lam[new]]),
        np.concatenate([np.array(gravity, float), g[new]]),
    )


def _check_places(
    benchmarks: Columns, latitude: NDArray[np.float64], longitude: NDArray[np.float64]
) -> None:
    names, gravity = benchmarks.texts["id"], benchmarks.numbers["gravity"]
    _, first = np.unique(names.astype(str), return_index=True)
    again = np.ones(names.size, dtype=bool)
    again[first] = False
    benchmarks.refuse(again, "the id is listed before", key="id", advice="Give each its own")
    benchmarks.refuse(~(np.abs(latitude) <= 90.0), "latitude is not within -90..90", key="id")
    beyond = ~((longitude >= -180.0) & (longitude <= 360.0))
    benchmarks.refuse(beyond, "longitude is not within -180..360", key="id")
    wrong = ~np.isnan(gravity) & ~((gravity >= 9.5) & (gravity <= 10.0))
    benchmarks.refuse(wrong, "gravity is not within 9.5..10.0 m s-2", key="id")
