"""How alike the errors of a geoid model are at two places."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError

__all__ = ["ErrorModel"]

_EARTH_RADIUS = 6_371_008.7714  # m, mean radius R1 of GRS80 (Moritz 1980)


@dataclass(frozen=True)
class ErrorModel:
    """A Gauss-Markov process on the sphere, beside errors that no two places share.

    Attributes
    ----------
    u : float
        Standard uncertainty of one value, m.
    correlation_length : float or None
        Distance in m over which the correlation falls to 1/e (first order) or to 2/e (second
        order); None for errors that are independent from place to place.
    order : 1 or 2
        exp(-d/L), or (1 + d/L) exp(-d/L) (Moritz 1978, covariance of a Markov process).
    white_share : float
        Share of the variance that no two places share, 0 to 1.

    Raises
    ------
    DataError
        If a value is out of range.
    """

    u: float
    correlation_length: float | None = None
    order: Literal[1, 2] = 1
    white_share: float = 0.0

    def __post_init__(self) -> None:
        length = self.correlation_length
        if not self.u >= 0.0 or not 0.0 <= self.white_share <= 1.0 or self.order not in (1, 2):
            raise DataError(
                "the error model of a geoid is out of range",
                value=f"u {self.u}, order {self.order}, white share {self.white_share}",
                allowed="u >= 0 m, order 1 or 2, white share 0 to 1",
            )
        if length is not None and not length > 0.0:
            raise DataError("a correlation length must be positive", value=f"{length} m")

    def correlation(
        self, latitude: NDArray[np.float64], longitude: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Correlation of the errors between points given in degrees, shape (N, N)."""
        if self.correlation_length is None:
            return np.eye(latitude.size)
        ratio = great_circle(latitude, longitude) / self.correlation_length
        shape = np.exp(-ratio) * (1.0 if self.order == 1 else 1.0 + ratio)
        same = ratio == 0.0
        return np.where(same, 1.0, (1.0 - self.white_share) * shape)


def great_circle(
    latitude: NDArray[np.float64], longitude: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Distances between points on a sphere of mean radius, shape (N, N), m (haversine form)."""
    phi, lam = np.radians(latitude), np.radians(longitude)
    north = np.sin((phi[:, None] - phi[None, :]) / 2.0) ** 2
    east = np.sin((lam[:, None] - lam[None, :]) / 2.0) ** 2
    half = north + np.cos(phi)[:, None] * np.cos(phi)[None, :] * east
    return np.asarray(2.0 * _EARTH_RADIUS * np.arcsin(np.sqrt(np.minimum(half, 1.0))))
