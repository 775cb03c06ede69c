"""GNSS heights with a geoid model as rows of the linear model.

    C(h - N) + v = C - [o_g + n_g·north + e_g·east]

with the covariance of the model's errors between all points.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ConventionError
from clockgeo.gravity import (
    TideSystem,
    convert_tide_system,
    normal_gravity,
    number_of_normal_height,
    number_of_orthometric_height,
    zero_level_shift,
)
from clockgeo.gravity.heights import HELMERT_GRADIENT
from clockgeo.gravity.separation import BOUGUER_ANOMALY
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.network.columns import Columns, from_rows, read_columns
from clockgeo.network.observations import numbers_at
from clockgeo.network.points import Points
from clockgeo.network.tables import GnssHeights, TermSettings
from clockgeo.network.terms import TermFrame, add_priors, listed_points, term_entries, term_frame
from clockgeo.network.unknowns import GeoidTerm, Term

if TYPE_CHECKING:
    from clockgeo.gravity import GeoidModel

__all__ = ["add_gnss", "gnss_columns"]

GNSS_NUMBERS = ("ellipsoidal_height", "u", "separation")


def gnss_columns(gnss: GnssHeights, read: str | None) -> Columns:
    """Ellipsoidal heights from a file (`read` is its path) or rows."""
    if read is not None:
        required = ("point", "ellipsoidal_height")
        return read_columns(read, texts=("point",), numbers=GNSS_NUMBERS, required=required)
    where = f"[[gnss]] {gnss.id}"
    return from_rows(gnss.heights, source=where, texts=("point",), numbers=GNSS_NUMBERS)


def add_gnss(
    builder: ModelBuilder,
    tables: Sequence[tuple[GnssHeights, Columns]],
    points: Points,
    *,
    geoid: GeoidModel,
    terms: TermSettings,
    tide_system: TideSystem,
    zero_level: str | float,
) -> TermFrame:
    """Add all GNSS heights with one geoid model, whose errors are correlated over the net.

    Parameters
    ----------
    builder : ModelBuilder
    tables : sequence of (GnssHeights, Columns)
        Tables and their heights, see `gnss_columns`.
    points : Points
    geoid : GeoidModel
        What gives separations, their covariance, and their conventions.
    terms : TermSettings
        Bias and tilts of the geoid model that are estimated.
    tide_system, zero_level
        Of the campaign.

    Returns
    -------
    TermFrame
        Of the geoid model, with the rows of all tables.

    Raises
    ------
    DataError
        If a table has no heights, one has no u, or a point is unknown or outside the model.
    ConventionError
        If the model was fitted to levelling, or states no covariance.
    """
    if geoid.hybrid:
        raise ConventionError(
            "a geoid model that was fitted to levelling cannot be adjusted with that levelling",
            value=geoid.name,
            advice="Use the gravimetric model",
        )
    parts = [_observed(gnss, columns, points, geoid, tide_system) for gnss, columns in tables]
    places = np.concatenate([part.places for part in parts])
    values = np.concatenate([part.values for part in parts])
    slope = np.concatenate([part.slope for part in parts])
    own = np.concatenate([part.own for part in parts])
    values = values + zero_level_shift(source=geoid.zero_level, target=zero_level)
    rows = tuple(row for part in parts for row in part.rows)
    frame = term_frame(geoid.name, None, terms, points, places, values, rows)
    names: dict[Term, Hashable] = {term: GeoidTerm(geoid.name, term) for term in frame.terms}
    on = [(numbers_at(points, places), 1.0), *term_entries(frame, names)]
    builder.observe_all(rows, kind="gnss", values=values, on=on)
    latitude, longitude = points.latitude[places], points.longitude[places]
    errors = geoid.covariance(latitude, longitude) * np.outer(slope, slope)
    builder.correlate(rows, errors + np.diag(own**2))
    add_priors(builder, terms, names, frame.gravity)
    return frame


@dataclass(frozen=True, eq=False)
class _Observed:
    """Heights of one table as numbers above the model's zero level; arrays of shape (m,)."""

    places: NDArray[np.int64]
    values: NDArray[np.float64]
    slope: NDArray[np.float64]
    own: NDArray[np.float64]
    rows: tuple[str, ...]


def _observed(
    gnss: GnssHeights,
    columns: Columns,
    points: Points,
    geoid: GeoidModel,
    tide_system: TideSystem,
) -> _Observed:
    places = listed_points(columns, points, f"[[gnss]] {gnss.id}")
    latitude, longitude = points.latitude[places], points.longitude[places]
    u = columns.filled("u", gnss.u)
    columns.refuse(np.isnan(u), "the ellipsoidal height has no u", key="point", advice="Give u")
    columns.refuse(~(u > 0.0), "u of the ellipsoidal height is not positive", key="point")
    separation = columns.numbers["separation"].copy()
    missing = np.isnan(separation)
    if missing.any():
        separation[missing] = geoid.sample(latitude[missing], longitude[missing])
    above_ellipsoid = convert_tide_system(
        columns.numbers["ellipsoidal_height"],
        latitude,
        quantity="ellipsoidal_height",
        source=gnss.tide_system,
        target=tide_system,
    )
    surface = convert_tide_system(
        separation,
        latitude,
        quantity=geoid.quantity,
        source=geoid.tide_system,
        target=tide_system,
    )
    height = np.asarray(above_ellipsoid) - np.asarray(surface)
    number, slope, u_gravity = _number_above_geoid(geoid, height, latitude, points.gravity[places])
    rows = tuple(f"{gnss.id}: {name}" for name in columns.texts["point"])
    return _Observed(places, number, slope, np.hypot(u * slope, u_gravity), rows)


def _number_above_geoid(
    geoid: GeoidModel,
    height: NDArray[np.float64],
    latitude: NDArray[np.float64],
    gravity: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """C above the model's zero level, dC/dh, and the part of u from gravity not measured."""
    number = np.asarray(number_of_normal_height(height, latitude))
    slope = np.asarray(normal_gravity(latitude, height))
    if geoid.quantity == "height_anomaly":
        return number, slope, np.zeros(height.size)
    measured = ~np.isnan(gravity)
    number[measured] = number_of_orthometric_height(height[measured], gravity[measured])
    slope[measured] = gravity[measured] + 2.0 * HELMERT_GRADIENT.value * height[measured]
    return number, slope, np.where(measured, 0.0, BOUGUER_ANOMALY.u * np.abs(height))
