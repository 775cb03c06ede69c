"""The normal gravity field of a level ellipsoid, in closed form and without cancellation."""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.places import checked_latitude, plain

if TYPE_CHECKING:
    import boule

__all__ = [
    "cartesian",
    "geocentric_radius",
    "normal_geopotential_number",
    "normal_gravity",
    "normal_potential",
    "reference_ellipsoid",
]

_ELLIPSOIDS = ("grs80", "wgs84")
_Q_TERMS = 9  # of the series of q in E/u = 0.08; the tenth is below 1e-19 of the first


@cache
def reference_ellipsoid(name: str = "grs80") -> boule.Ellipsoid:
    """Reference ellipsoid by name, with its gravity field.

    Parameters
    ----------
    name : str
        `grs80` (Moritz 1980) or `wgs84`.

    Raises
    ------
    ConventionError
        If the name is unknown.
    """
    import boule

    if name not in _ELLIPSOIDS:
        raise ConventionError(
            "unknown ellipsoid", value=repr(name), allowed=f"One of {', '.join(_ELLIPSOIDS)}"
        )
    return {"grs80": boule.GRS80, "wgs84": boule.WGS84}[name]


def normal_gravity(
    latitude: ArrayLike, height: ArrayLike = 0.0, *, ellipsoid: str = "grs80"
) -> float | NDArray[np.float64]:
    """Normal gravity γ at any height, in closed form (boule, after Li and Götze 2001).

    Parameters
    ----------
    latitude : float or array
        Geodetic latitude in degrees.
    height : float or array
        Ellipsoidal height in m.
    ellipsoid : str
        Name of the reference ellipsoid.

    Returns
    -------
    float or array
        γ = |grad U| in m s⁻², good to 2e-10.

    Notes
    -----
    Below the ellipsoid the outer field is continued downwards, as normal heights need it.

    Examples
    --------
    >>> round(normal_gravity(45.0), 9)
    9.806199203
    """
    latitudes, heights = np.broadcast_arrays(checked_latitude(latitude), _finite(height))
    body = reference_ellipsoid(ellipsoid)
    p, z = _meridian(body, latitudes, heights)
    u = np.sqrt(body.semiminor_axis**2 + _square_step(body, latitudes, heights, p, z))
    reduced = np.degrees(np.arctan2(z / u, p / np.hypot(u, body.linear_eccentricity)))
    place = (None, reduced, u)
    gravity = body.normal_gravity(place, coordinate_system="ellipsoidal harmonic", si_units=True)
    return plain(gravity)


def normal_geopotential_number(
    latitude: ArrayLike, height: ArrayLike, *, ellipsoid: str = "grs80"
) -> float | NDArray[np.float64]:
    """Potential U0 - U(h) by which a point lies below the ellipsoid's own, in m² s⁻².

    Grows with height; it is the geopotential number of the normal height `height`.

    Parameters
    ----------
    latitude : float or array
        Geodetic latitude in degrees.
    height : float or array
        Ellipsoidal height in m, above -50 000.
    ellipsoid : str
        Name of the reference ellipsoid.

    Returns
    -------
    float or array

    Notes
    -----
    Both potentials are taken at the reduced latitude β of the point, where U0 = U(b, β), so that

    U0 - U = GM/E atan(E (u-b)/(u b + E²)) + (ω²a²/2)(1 - q/q0)(sin²β - 1/3) - (ω²/2)(u²-b²) cos²β,

    where u² - b² is the root s of s² + (2b² - p² - z² + E²) s =
    h (2 N b² + h (b² cos²φ + a² sin²φ)).
    No two large numbers are subtracted. Heiskanen and Moritz 1967, section 2-7. Error below
    1e-9 m² s⁻² (0.1 nm) up to 10 km.

    Examples
    --------
    >>> round(normal_geopotential_number(45.0, 1000.0), 6)
    9804.656645
    """
    latitudes, heights = np.broadcast_arrays(checked_latitude(latitude), _finite(height))
    body = reference_ellipsoid(ellipsoid)
    a, b, omega = body.semimajor_axis, body.semiminor_axis, body.angular_velocity
    E, GM = body.linear_eccentricity, body.geocentric_grav_const
    p, z = _meridian(body, latitudes, heights)
    s = _square_step(body, latitudes, heights, p, z)
    u = np.sqrt(b**2 + s)
    step = s / (u + b)
    sine_squared = (z / u) ** 2
    cosine_squared = p**2 / (u**2 + E**2)
    attraction = GM / E * np.arctan(E * step / (u * b + E**2))
    flattening = (omega * a) ** 2 / 2 * (1.0 - _q(E / u) / _q(E / b)) * (sine_squared - 1 / 3)
    return plain(attraction + flattening - omega**2 / 2 * s * cosine_squared)


def normal_potential(
    latitude: ArrayLike, height: ArrayLike, *, ellipsoid: str = "grs80"
) -> float | NDArray[np.float64]:
    """Normal potential U (gravitational and centrifugal) in m² s⁻².

    See `normal_geopotential_number`, which is to be preferred for differences: U itself is about
    6e7 and steps by 7e-9 m² s⁻² in float64.
    """
    number = normal_geopotential_number(latitude, height, ellipsoid=ellipsoid)
    surface = float(reference_ellipsoid(ellipsoid).reference_normal_gravity_potential)
    return surface - number


def geocentric_radius(
    latitude: ArrayLike, height: ArrayLike = 0.0, *, ellipsoid: str = "grs80"
) -> float | NDArray[np.float64]:
    """Distance from the Earth's centre in m of a point at a geodetic latitude and height."""
    latitudes, heights = np.broadcast_arrays(checked_latitude(latitude), _finite(height))
    return plain(np.hypot(*_meridian(reference_ellipsoid(ellipsoid), latitudes, heights)))


def cartesian(
    latitude: float, longitude: float, height: float, *, ellipsoid: str = "grs80"
) -> NDArray[np.float64]:
    """Earth-fixed coordinates x, y, z in m of one point; angles in degrees."""
    body = reference_ellipsoid(ellipsoid)
    p, z = _meridian(body, checked_latitude(latitude), _finite(height))
    angle = np.radians(longitude)
    return np.array([p * np.cos(angle), p * np.sin(angle), z])


def _meridian(
    body: Any, latitude: NDArray[np.float64], height: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Distance p from the axis and z from the equator, m."""
    phi = np.radians(latitude)
    N = _prime_vertical(body, phi)
    flat = (body.semiminor_axis / body.semimajor_axis) ** 2
    return (N + height) * np.cos(phi), (N * flat + height) * np.sin(phi)


def _prime_vertical(body: Any, phi: NDArray[np.float64]) -> NDArray[np.float64]:
    a, b = body.semimajor_axis, body.semiminor_axis
    return np.asarray(a**2 / np.hypot(a * np.cos(phi), b * np.sin(phi)))


def _square_step(
    body: Any,
    latitude: NDArray[np.float64],
    height: NDArray[np.float64],
    p: NDArray[np.float64],
    z: NDArray[np.float64],
) -> NDArray[np.float64]:
    """u² - b² of a point in ellipsoidal coordinates, m²."""
    a, b, E = body.semimajor_axis, body.semiminor_axis, body.linear_eccentricity
    phi = np.radians(latitude)
    N = _prime_vertical(body, phi)
    axes = (b * np.cos(phi)) ** 2 + (a * np.sin(phi)) ** 2
    right = height * (2 * N * b**2 + height * axes)
    linear = 2 * b**2 + E**2 - p**2 - z**2
    root = np.sqrt(linear**2 + 4 * right)
    near = linear > 0.0
    small = 2 * right / np.where(near, linear + root, 1.0)
    return np.asarray(np.where(near, small, (root - linear) / 2))


def _q(x: ArrayLike) -> NDArray[np.float64]:
    """Sum q = ((1 + 3/x²) atan x - 3/x)/2 by its series in x = E/u, free of cancellation."""
    k = np.arange(1, _Q_TERMS + 1)
    coefficients = 2 * k * (-1.0) ** (k + 1) / ((2 * k + 1) * (2 * k + 3))
    x = np.asarray(x, dtype=np.float64)
    return np.asarray(x**3 * np.polynomial.polynomial.polyval(x**2, coefficients))


def _finite(height: ArrayLike) -> NDArray[np.float64]:
    heights = np.asarray(height, dtype=np.float64)
    if not np.all(heights > -50_000.0):
        raise DataError(
            "height out of range",
            value=float(np.extract(~(heights > -50_000.0), heights)[0]),
            allowed="Ellipsoidal height in m, above -50 000",
        )
    return heights
