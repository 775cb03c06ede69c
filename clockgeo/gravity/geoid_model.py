"""A gridded geoid or quasigeoid model with its conventions, sampled anywhere it reaches."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.geoid_covariance import ErrorModel, covariance_of_differences
from clockgeo.gravity.grid_tile import GridTile
from clockgeo.gravity.interpolation import Interpolation, checked_interpolation
from clockgeo.gravity.places import checked_latitude, checked_longitude, plain
from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.gravity.zero_levels import ZeroLevel

__all__ = ["GeoidModel", "GridTile", "Outside", "Quantity"]

Quantity = Literal["geoid_height", "height_anomaly"]
Outside = Literal["error", "nan"]
_BLOCK = 16_384  # points at a time, so that what is computed for them stays in the cache


@dataclass(frozen=True, eq=False)
class GeoidModel:
    """A geoid or quasigeoid with everything that says what its numbers mean.

    Attributes
    ----------
    name : str
        File it was read from.
    tiles : tuple of GridTile
        The first that holds a point wins: the deepest of a nest, the finest.
    quantity : {"geoid_height", "height_anomaly"}
        Goes with orthometric or with normal heights.
    tide_system : TideSystem
    zero_level : ZeroLevel
        Of the surface.
    ellipsoid : str
        The one that heights are counted from, such as `grs80`.
    interpolation : {"bilinear", "biquadratic", "bicubic"}
        What the model is meant to be sampled with.
    errors : ErrorModel or None
        Size and correlation of the model's errors; None where nothing is stated.
    epoch : float or None
        Decimal year that the values hold for.
    hybrid : bool
        Whether the model was fitted to levelling.
    fitted_to : str or None
        Levelling datum that a hybrid model was fitted to, which it then cannot check.
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
    epoch: float | None = None
    hybrid: bool = False
    fitted_to: str | None = None
    source: str = ""

    def sample(
        self,
        latitude: ArrayLike,
        longitude: ArrayLike,
        *,
        outside: Outside = "error",
        interpolation: Interpolation | str | None = None,
        epoch: float | None = None,
    ) -> float | NDArray[np.float64]:
        """Value of the model at points.

        Parameters
        ----------
        latitude, longitude : float or array, broadcast together
            Geodetic, in degrees; longitudes may run -180..180 or 0..360.
        outside : {"error", "nan"}
            What happens at points outside the grid or beside nodes without data.
        interpolation : optional
            Another method than the model's own.
        epoch : float, optional
            Decimal year; the model's rate brings its values there. Without it they are those of the
            model's own epoch.

        Returns
        -------
        float or array
            m.

        Raises
        ------
        DataError
            If a coordinate is out of range, or a point has no value and `outside` is "error".
        ConventionError
            If the method is unknown, or an epoch is asked of a model without rate or epoch.
        """
        method = checked_interpolation(interpolation or self.interpolation)
        values = self._field("values", latitude, longitude, outside, method)
        if epoch is not None:
            years = epoch - self._epoch_with_rate()
            values = values + years * self._field("rate", latitude, longitude, outside, method)
        return plain(values)

    def u(
        self, latitude: ArrayLike, longitude: ArrayLike, *, outside: Outside = "error"
    ) -> float | NDArray[np.float64]:
        """Standard uncertainty of the model at points, m; a field of u is sampled bilinearly.

        Raises
        ------
        ConventionError
            If neither the file nor the user states one.
        DataError
            If a coordinate is out of range, or a point has no value and `outside` is "error".
        """
        if any(tile.u is not None for tile in self.tiles):
            return plain(self._field("u", latitude, longitude, outside, "bilinear"))
        phi, lam = np.broadcast_arrays(checked_latitude(latitude), checked_longitude(longitude))
        return plain(np.full(np.broadcast_shapes(phi.shape, lam.shape), self._stated_errors().u))

    def covariance(self, latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
        """Covariance of the model's errors between points, shape (N, N), m².

        Raises
        ------
        ConventionError
            If no uncertainty is stated, or no correlation length and the points differ.
        """
        phi, lam = (np.atleast_1d(np.asarray(x, dtype=np.float64)) for x in (latitude, longitude))
        sizes = np.atleast_1d(np.asarray(self.u(phi, lam)))
        try:
            alike = (self.errors or ErrorModel(u=0.0)).correlation(phi, lam)
        except ConventionError as error:
            raise ConventionError(
                error.what, where=self.name, allowed=error.allowed, advice=error.advice
            ) from None
        return np.outer(sizes, sizes) * alike

    def difference_covariance(
        self, latitude: ArrayLike, longitude: ArrayLike, pairs: Sequence[tuple[int, int]]
    ) -> NDArray[np.float64]:
        """Covariance of differences between points, second minus first, shape (M, M), m².

        See `covariance` and `covariance_of_differences`.
        """
        return covariance_of_differences(self.covariance(latitude, longitude), pairs)

    def interpolation_error(
        self,
        latitude: ArrayLike,
        longitude: ArrayLike,
        *,
        interpolation: Interpolation | str | None = None,
        outside: Outside = "error",
    ) -> float | NDArray[np.float64]:
        """Estimate of the interpolation error at points, m.

        Notes
        -----
        The absolute difference from another method: of the bilinear value from the bicubic one, of
        either smooth method from the other. It tells what the grid resolves; what is rougher than
        the grid shows nowhere in it.
        """
        method = checked_interpolation(interpolation or self.interpolation)
        other = "biquadratic" if method == "bicubic" else "bicubic"
        values = [
            np.asarray(self.sample(latitude, longitude, outside=outside, interpolation=one))
            for one in (method, other)
        ]
        return plain(np.abs(values[0] - values[1]))

    @property
    def conventions(self) -> dict[str, str | float]:
        """What the model states, by the names that its files use (see `CONVENTIONS`)."""
        level, errors = self.zero_level, self.errors
        named = not level.name.startswith("W0 = ")
        stated: dict[str, str | float | None] = {
            "quantity": self.quantity,
            "tide_system": str(self.tide_system),
            "zero_level": level.name if named else None,
            "zero_level_potential": level.w0,
            "ellipsoid": self.ellipsoid,
            "interpolation": self.interpolation,
            "u": errors.u if errors else None,
            "correlation_length": errors.correlation_length if errors else None,
            "epoch": self.epoch,
            "model_type": "hybrid" if self.hybrid else None,
            "fitted_to": self.fitted_to,
        }
        return {key: value for key, value in stated.items() if value is not None}

    @property
    def extent(self) -> str:
        """Where the model reaches, in words."""
        south, north = min(t.south for t in self.tiles), max(t.north for t in self.tiles)
        if any(tile.closes for tile in self.tiles):
            return f"Latitudes {south:g}..{north:g}, all longitudes"
        west = min(tile.west for tile in self.tiles)
        east = max(tile.west + tile.width for tile in self.tiles)
        return f"Latitudes {south:g}..{north:g}, longitudes {west:g}..{east:g}"

    def _field(
        self,
        which: str,
        latitude: ArrayLike,
        longitude: ArrayLike,
        outside: str,
        method: Interpolation,
    ) -> NDArray[np.float64]:
        if outside not in get_args(Outside):
            raise ConventionError(
                "unknown rule for points outside the grid",
                value=repr(outside),
                allowed=f"One of {', '.join(get_args(Outside))}",
            )
        phi, lam = np.broadcast_arrays(checked_latitude(latitude), checked_longitude(longitude))
        shape = phi.shape
        phi, lam = phi.ravel(), lam.ravel()
        found, inside = np.full(phi.size, np.nan), np.zeros(phi.size, dtype=bool)
        for start in range(0, phi.size, _BLOCK):
            block = slice(start, start + _BLOCK)
            found[block], inside[block] = self._block(which, phi[block], lam[block], method)
        if outside == "error":
            self._refuse_missing(found, inside, phi, lam)
        return found.reshape(shape)

    def _block(
        self,
        which: str,
        phi: NDArray[np.float64],
        lam: NDArray[np.float64],
        method: Interpolation,
    ) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
        """Sample the tiles in their order until every point has been inside one."""
        values, inside = np.full(phi.size, np.nan), np.zeros(phi.size, dtype=bool)
        for tile in self.tiles:
            if getattr(tile, which) is None:
                continue
            open_points = np.flatnonzero(~inside)
            if open_points.size == phi.size:
                values, inside = tile.sample(which, phi, lam, method)
            else:
                found, within = tile.sample(which, phi[open_points], lam[open_points], method)
                values[open_points] = found
                inside[open_points] = within
            if inside.all():
                break
        return values, inside

    def _refuse_missing(
        self,
        found: NDArray[np.float64],
        inside: NDArray[np.bool_],
        phi: NDArray[np.float64],
        lam: NDArray[np.float64],
    ) -> None:
        missing = np.flatnonzero(np.isnan(found))
        if not missing.size:
            return
        first = int(missing[0])
        what = "has no data in the grid" if inside[first] else "lies outside the grid"
        raise DataError(
            f"a point {what} ({missing.size} of {found.size} points have no value)",
            value=f"latitude {phi[first]:.6f}, longitude {lam[first]:.6f}",
            where=self.name,
            allowed=self.extent,
            advice="Use another model, or ask for nan there (outside='nan', --outside nan)",
        )

    def _stated_errors(self) -> ErrorModel:
        if self.errors is None:
            raise ConventionError(
                "the model states no uncertainty (field u)",
                where=self.name,
                advice="State u in m, and the correlation length of its errors if it is known",
            )
        return self.errors

    def _epoch_with_rate(self) -> float:
        if self.epoch is None or all(tile.rate is None for tile in self.tiles):
            raise ConventionError(
                "the model holds for no other epoch (fields epoch and rate)",
                where=self.name,
                allowed="A model that states its epoch and a rate",
                advice="Leave the epoch out",
            )
        return self.epoch
