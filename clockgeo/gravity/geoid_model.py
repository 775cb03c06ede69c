"""A gridded geoid or quasigeoid model with its conventions, sampled anywhere it reaches."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.geoid_covariance import ErrorModel
from clockgeo.gravity.interpolation import Interpolation, interpolate, smallest_side
from clockgeo.gravity.places import checked_latitude, checked_longitude, plain
from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.gravity.zero_levels import ZeroLevel

__all__ = ["GeoidModel", "GridTile", "Quantity"]

Quantity = Literal["geoid_height", "height_anomaly"]
_EDGE = 1e-9  # degrees: rounding of coordinates that lie on the edge


@dataclass(frozen=True, eq=False)
class GridTile:
    """A regular grid of node values.

    Attributes
    ----------
    south, west : float
        Latitude and longitude of the first node in degrees.
    latitude_step, longitude_step : float
        Distances of the nodes in degrees, > 0.
    values : float array, shape (rows, columns)
        m, from south to north and west to east; NaN for no data.
    u : float array of the same shape, or None
        Standard uncertainty of each node in m.
    """

    south: float
    west: float
    latitude_step: float
    longitude_step: float
    values: NDArray[np.floating]
    u: NDArray[np.floating] | None = None

    @property
    def north(self) -> float:
        """Latitude of the last row in degrees."""
        return self.south + (self.values.shape[0] - 1) * self.latitude_step

    @property
    def width(self) -> float:
        """Longitude of the last column minus that of the first, degrees."""
        return (self.values.shape[1] - 1) * self.longitude_step

    @property
    def closes(self) -> bool:
        """Whether the columns go round the Earth."""
        return self.width + self.longitude_step > 360.0 - 0.01 * self.longitude_step

    def places(
        self, latitude: NDArray[np.float64], longitude: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.bool_]]:
        """Fractional row and column of points, and which of them lie in the tile."""
        row = (latitude - self.south) / self.latitude_step
        east = np.mod(longitude - self.west, 360.0)
        east = np.where(east > 360.0 - _EDGE, 0.0, east)
        column = east / self.longitude_step
        rows, columns = self.values.shape
        slack = _EDGE / self.latitude_step
        inside = (row >= -slack) & (row <= rows - 1 + slack)
        if not self.closes:
            inside &= column <= columns - 1 + _EDGE / self.longitude_step
        return np.clip(row, 0.0, rows - 1), column, inside

    def sample(
        self,
        field: NDArray[np.floating],
        row: NDArray[np.float64],
        column: NDArray[np.float64],
        method: Interpolation,
    ) -> NDArray[np.float64]:
        """Interpolate a field of this tile's shape at fractional rows and columns."""
        if self.closes:
            side = smallest_side(method)
            # Columns repeated at both ends let the stencil run across the seam.
            columns = np.arange(-side, round(360.0 / self.longitude_step) + side)
            field = field[:, columns % round(360.0 / self.longitude_step)]
            column = column + side
        return interpolate(field, row, column, method)


@dataclass(frozen=True, eq=False)
class GeoidModel:
    """A geoid or quasigeoid with everything that says what its numbers mean.

    Attributes
    ----------
    name : str
        File it was read from.
    tiles : tuple of GridTile
        Finest first; the finest that holds a point wins.
    quantity : "geoid_height" or "height_anomaly"
        Goes with orthometric or with normal heights.
    tide_system : TideSystem
    zero_level : ZeroLevel
        Of the surface.
    ellipsoid : str
        The one that heights are counted from, such as `grs80`.
    interpolation : "bilinear", "biquadratic" or "bicubic"
        What the model is meant to be sampled with.
    errors : ErrorModel or None
        Size and correlation of the model's errors; None where nothing is stated.
    epoch : str or None
    fitted_to : str or None
        Levelling datum that a hybrid model was fitted to; such a model is no independent check of it.
    source : str
        Title or reference, as the file states it.
    """

    name: str
    tiles: tuple[GridTile, ...]
    quantity: Quantity
    tide_system: TideSystem
    zero_level: ZeroLevel
    ellipsoid: str
    interpolation: Interpolation = "bilinear"
    errors: ErrorModel | None = None
    epoch: str | None = None
    fitted_to: str | None = None
    source: str = ""

    def sample(
        self,
        latitude: ArrayLike,
        longitude: ArrayLike,
        *,
        outside: Literal["error", "nan"] = "error",
        interpolation: Interpolation | None = None,
    ) -> float | NDArray[np.float64]:
        """Value of the model at points.

        Parameters
        ----------
        latitude, longitude : float or array, broadcast together
            Geodetic, in degrees; longitudes may run -180..180 or 0..360.
        outside : "error" or "nan"
            What happens at points outside the grid or beside nodes without data.
        interpolation : optional
            Another method than the model's own.

        Returns
        -------
        float or array
            m.

        Raises
        ------
        DataError
            If a coordinate is out of range, or a point has no value and `outside` is "error".
        """
        method = interpolation or self.interpolation
        return self._sampled("values", latitude, longitude, outside, method)

    def _sampled(
        self,
        name: str,
        latitude: ArrayLike,
        longitude: ArrayLike,
        outside: str,
        method: Interpolation,
    ) -> float | NDArray[np.float64]:
        phi, lam = np.broadcast_arrays(checked_latitude(latitude), checked_longitude(longitude))
        shape = phi.shape
        phi, lam = phi.ravel(), lam.ravel()
        found = np.full(phi.shape, np.nan)
        open_points = np.arange(phi.size)
        for tile in self.tiles:
            field = tile.values if name == "values" else tile.u
            if field is None or not open_points.size:
                continue
            whole = open_points.size == phi.size
            at = (phi, lam) if whole else (phi[open_points], lam[open_points])
            row, column, inside = tile.places(*at)
            if inside.all():
                found[open_points] = tile.sample(field, row, column, method)
                open_points = open_points[:0]
                break
            here = open_points[inside]
            found[here] = tile.sample(field, row[inside], column[inside], method)
            open_points = open_points[~inside]
        if outside == "error":
            self._refuse_missing(found, open_points, phi, lam)
        return plain(found.reshape(shape))

    def _refuse_missing(
        self,
        found: NDArray[np.float64],
        outside: NDArray[np.int64],
        phi: NDArray[np.float64],
        lam: NDArray[np.float64],
    ) -> None:
        missing = np.flatnonzero(np.isnan(found))
        if not missing.size:
            return
        first = int(missing[0])
        what = "lies outside the grid" if outside.size else "has no data in the grid"
        raise DataError(
            f"a point {what} ({missing.size} of {found.size} points)",
            value=f"latitude {phi[first]:.6f}, longitude {lam[first]:.6f}",
            where=self.name,
            allowed=self.extent,
            advice="Use another model, or ask for nan there (outside='nan', --outside nan)",
        )

    @property
    def extent(self) -> str:
        """Where the model reaches, in words."""
        south, north = min(t.south for t in self.tiles), max(t.north for t in self.tiles)
        if any(tile.closes for tile in self.tiles):
            return f"Latitudes {south:g}..{north:g}, all longitudes"
        west = min(tile.west for tile in self.tiles)
        east = max(tile.west + tile.width for tile in self.tiles)
        return f"Latitudes {south:g}..{north:g}, longitudes {west:g}..{east:g}"

    def u(self, latitude: ArrayLike, longitude: ArrayLike) -> float | NDArray[np.float64]:
        """Standard uncertainty of the model at points, m.

        Raises
        ------
        ConventionError
            If neither the file nor the user states one.
        """
        if any(tile.u is not None for tile in self.tiles):
            return self._sampled("u", latitude, longitude, "error", "bilinear")
        phi, lam = np.broadcast_arrays(checked_latitude(latitude), checked_longitude(longitude))
        return plain(np.full(phi.shape, self._stated_errors().u) + 0.0 * lam)

    def covariance(self, latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
        """Covariance of the model's errors between points, shape (N, N), m².

        Raises
        ------
        ConventionError
            If no uncertainty is stated.
        """
        phi, lam = (np.atleast_1d(np.asarray(x, dtype=np.float64)) for x in (latitude, longitude))
        sizes = np.atleast_1d(np.asarray(self.u(phi, lam)))
        errors = self.errors if self.errors is not None else ErrorModel(u=float(sizes.max()))
        return np.outer(sizes, sizes) * errors.correlation(phi, lam)

    def _stated_errors(self) -> ErrorModel:
        if self.errors is None:
            raise ConventionError(
                "the model states no uncertainty",
                where=self.name,
                advice="State u in m (and the correlation length of its errors if it is known)",
            )
        return self.errors

    def interpolation_error(self, latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
        """Estimate of the interpolation error at points, m: bilinear against bicubic."""
        smooth = self.sample(latitude, longitude, interpolation="bicubic")
        return np.abs(np.asarray(self.sample(latitude, longitude)) - np.asarray(smooth))
