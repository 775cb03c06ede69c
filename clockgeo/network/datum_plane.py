"""Ways north and east on the ellipsoid, as the planes of vertical datums count them."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.gravity import reference_ellipsoid

__all__ = ["ways_from"]


def ways_from(
    origin: tuple[float, float], latitude: ArrayLike, longitude: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Ways north and east in m from an origin to points.

    Parameters
    ----------
    origin : (float, float)
        Latitude and longitude in degrees.
    latitude, longitude : array, shape (N,)
        Degrees; longitudes may run -180..180 or 0..360.

    Returns
    -------
    (float array, float array)
        ρ0 (φ - φ0) and ν0 (λ - λ0) cos φ, with the radii of curvature ρ0 of the meridian and ν0 of
        the prime vertical at the origin: the terms of EPSG method 1046 (IOGP 373-7-2), GRS80.
    """
    body = reference_ellipsoid("grs80")
    a, b = float(body.semimajor_axis), float(body.semiminor_axis)
    phi0 = np.radians(origin[0])
    root = np.hypot(a * np.cos(phi0), b * np.sin(phi0))
    rho, nu = (a * b) ** 2 / root**3, a**2 / root
    phi = np.radians(np.asarray(latitude, dtype=np.float64))
    turn = np.asarray(longitude, dtype=np.float64) - origin[1]
    turn = np.radians((turn + 180.0) % 360.0 - 180.0)
    return rho * (phi - phi0), nu * turn * np.cos(phi)
