"""How alike the errors of a geoid model are at two places."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.places import checked_latitude, checked_longitude

__all__ = ["ErrorModel", "covariance_of_differences"]

_EARTH_RADIUS = 6_371_008.7714  # m, mean radius R1 of GRS80 (Moritz 1980)


@dataclass(frozen=True)
class ErrorModel:
    """A Gauss-Markov process on the sphere, beside errors that no two places share.

    Attributes
    ----------
    u : float
        Standard uncertainty of one value, m.
    correlation_length : float or None
        L in m: the correlation falls to 1/e at L (first order) or to 2/e (second order). None where
        it is not known; then no two places can be compared.
    order : {1, 2}
        exp(-d/L), or (1 + d/L) exp(-d/L) (Moritz 1980, Advanced Physical Geodesy, section 23;
        from memory).
    white_share : float
        Share of the variance that no two places share, 0 to 1.

    Raises
    ------
    DataError
        If a value is out of range.

    Notes
    -----
    d is the straight distance between points of a sphere of mean radius: with it both functions are
    positive definite, which the second order would not be with the distance along the surface. Up
    to 500 km the two differ by less than 0.03 %.
    """

    u: float
    correlation_length: float | None = None
    order: Literal[1, 2] = 1
    white_share: float = 0.0

    def __post_init__(self) -> None:
        length = self.correlation_length
        fits = 0.0 <= self.u < np.inf and 0.0 <= self.white_share <= 1.0 and self.order in (1, 2)
        if not fits:
            raise DataError(
                "the error model of a geoid is out of range",
                value=f"u {self.u}, order {self.order}, white share {self.white_share}",
                allowed="u >= 0 m, order 1 or 2, white share 0 to 1",
            )
        if length is not None and not 0.0 < length < np.inf:
            raise DataError("a correlation length must be positive", value=f"{length} m")

    def correlation(self, latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
        """Correlation of the errors between points.

        Parameters
        ----------
        latitude, longitude : array, shape (N,)
            Degrees.

        Returns
        -------
        float array, shape (N, N)
            Points of equal coordinates have equal errors.

        Raises
        ------
        ConventionError
            If different places are asked for and the correlation length is not known.
        """
        distance = _distances(latitude, longitude)
        same = distance < 1e-3  # m
        if self.correlation_length is None:
            if not same.all():
                raise ConventionError(
                    "the correlation length of the geoid's errors is not stated",
                    allowed="A length in m over which the errors of the model are alike",
                    advice="State correlation_length; for independent errors state a short one",
                )
            return np.ones(distance.shape)
        ratio = distance / self.correlation_length
        shape = np.exp(-ratio) * (1.0 if self.order == 1 else 1.0 + ratio)
        return np.where(same, 1.0, (1.0 - self.white_share) * shape)

    def covariance(self, latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
        """Covariance between points of constant u, shape (N, N), m²; see `correlation`."""
        return self.u**2 * self.correlation(latitude, longitude)


def covariance_of_differences(
    covariance: ArrayLike, pairs: Sequence[tuple[int, int]]
) -> NDArray[np.float64]:
    """Covariance of differences of values, second minus first of each pair.

    Parameters
    ----------
    covariance : array, shape (N, N)
        Of the values.
    pairs : sequence of (int, int), length M
        Places of the two values in the covariance.

    Returns
    -------
    float array, shape (M, M)
        D C Dᵀ; for one pair of equal u it is 2 u² (1 - ρ).

    Raises
    ------
    DataError
        If a pair names a value that is not there.
    """
    values = np.asarray(covariance, dtype=np.float64)
    difference = np.zeros((len(pairs), values.shape[0]))
    for row, pair in enumerate(pairs):
        if not all(0 <= place < values.shape[0] for place in pair):
            raise DataError(
                "a pair names a point that is not there",
                value=pair,
                allowed=f"Places 0 to {values.shape[0] - 1}",
            )
        difference[row, pair[1]] += 1.0
        difference[row, pair[0]] -= 1.0
    return np.asarray(difference @ values @ difference.T)


def _distances(latitude: ArrayLike, longitude: ArrayLike) -> NDArray[np.float64]:
    """Straight distances between points of the mean sphere, shape (N, N), m."""
    phi = np.radians(np.atleast_1d(checked_latitude(latitude)))
    lam = np.radians(np.atleast_1d(checked_longitude(longitude)))
    places = _EARTH_RADIUS * np.stack(
        [np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)], axis=-1
    )
    return np.asarray(np.linalg.norm(places[:, None, :] - places[None, :, :], axis=-1))
