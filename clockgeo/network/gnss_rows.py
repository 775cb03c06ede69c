"""GNSS heights with a geoid model as rows of the linear model.

    C(h - N) + v = C - [o_g + n_g·north + e_g·east]

with the covariance of the model's errors between all points.
"""

from __future__ import annotations

from collections.abc import Hashable
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
    gnss: GnssHeights,
    columns: Columns,
    points: Points,
    *,
    geoid: GeoidModel,
    terms: TermSettings,
    tide_system: TideSystem,
    zero_level: str | float,
) -> TermFrame:
    """Add GNSS heights with a geoid model; its errors are correlated over the net.

    Parameters
    ----------
    builder : ModelBuilder
    gnss : GnssHeights
    columns : Columns
        Its heights, see `gnss_columns`.
    points : Points
    geoid : GeoidModel
        What gives separations, their covariance, and their conventions.
    terms : TermSettings
        Bias and tilts of the geoid model that are estimated.
    tide_system, zero_level
        Of the campaign.

    Raises
    ------
    DataError
        If there are no heights, one has no u, or a point is unknown or outside the model.
    ConventionError
        If the model was fitted to levelling, or states no covariance.
    """
    if geoid.hybrid:
        raise ConventionError(
            "a geoid model that was fitted to levelling cannot be adjusted with that levelling",
            value=geoid.name,
            advice="Use the gravimetric model",
        )
    places = listed_points(columns, points, f"[[gnss]] {gnss.id}")
    latitude, longitude = points.latitude[places], points.longitude[places]
    u = columns.filled("u", gnss.u)
    columns.refuse(np.isnan(u), "the ellipsoidal height has no u", key="point", advice="Give u")
    separation = columns.numbers["separation"].copy()
    missing = np.isnan(separation)
    if missing.any():
        separation[missing] = geoid.sample(latitude[missing], longitude[missing])
    height = np.asarray(
        convert_tide_system(
            columns.numbers["ellipsoidal_height"],
            latitude,
            quantity="ellipsoidal_height",
            source=gnss.tide_system,
            target=tide_system,
        )
    ) - np.asarray(
        convert_tide_system(
            separation,
            latitude,
            quantity=geoid.quantity,
            source=geoid.tide_system,
            target=tide_system,
        )
    )
    number, slope, u_gravity = _number_above_geoid(geoid, height, latitude, points.gravity[places])
    values = number + zero_level_shift(source=geoid.zero_level, target=zero_level)
    own = np.hypot(u * slope, u_gravity)
    rows = tuple(f"{gnss.id}: {name}" for name in columns.texts["point"])
    frame = term_frame(geoid.name, None, terms, points, places, values, rows)
    names: dict[Term, Hashable] = {term: GeoidTerm(geoid.name, term) for term in frame.terms}
    on = [(numbers_at(points, places), 1.0), *term_entries(frame, names)]
    builder.observe_all(list(rows), kind="gnss", values=values, on=on)
    errors = geoid.covariance(latitude, longitude) * np.outer(slope, slope)
    builder.correlate(rows, errors + np.diag(own**2))
    add_priors(builder, terms, names, frame.gravity)
    return frame


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
