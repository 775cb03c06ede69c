"""Normal, orthometric and dynamic heights from geopotential numbers, and back.

C in m² s⁻² is counted from the zero level of the height system and in its tide system; both pass
through these conversions unchanged. Every function is vectorised and gives a scalar for scalars.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.constants import Constant
from clockgeo.errors import DataError
from clockgeo.gravity.normal_field import normal_geopotential_number, normal_gravity
from clockgeo.gravity.places import checked_gravity, checked_height, checked_latitude, plain

__all__ = [
    "DYNAMIC_GRAVITY",
    "HELMERT_GRADIENT",
    "dynamic_height",
    "normal_height",
    "number_of_dynamic_height",
    "number_of_normal_height",
    "number_of_orthometric_height",
    "number_of_rigorous_height",
    "orthometric_height",
    "rigorous_orthometric_height",
]

Values = float | NDArray[np.float64]

DYNAMIC_GRAVITY = Constant(
    "gamma_45", 9.806199203, "m s-2", 0.0, "normal gravity of GRS80 at latitude 45°, Moritz 1980"
)
HELMERT_GRADIENT = Constant(
    "q",
    4.24e-7,
    "s-2",
    0.0,
    "half the Poincaré-Prey gradient for 2670 kg m-3; Heiskanen and Moritz 1967, eq. 4-26",
)


def normal_height(
    geopotential_number: ArrayLike, latitude: ArrayLike, *, ellipsoid: str = "grs80"
) -> Values:
    """Normal height H* of a geopotential number: by definition U0 - U(H*) = C.

    Parameters
    ----------
    geopotential_number : float or array
        C in m² s⁻².
    latitude : float or array
        Geodetic latitude in degrees.
    ellipsoid : str
        Name of the ellipsoid whose normal field is meant.

    Returns
    -------
    float or array
        H* in m; dH*/dC is 1/γ(H*).

    Raises
    ------
    DataError
        If C is not that of a place on Earth (-118 000..89 000), or a latitude is out of range.

    Notes
    -----
    Newton's method on the closed form; error below 1e-9 m.

    Examples
    --------
    >>> round(normal_height(748.0, 52.3), 6)
    76.228357
    """
    number, phi = np.broadcast_arrays(_checked(geopotential_number), checked_latitude(latitude))
    height = number / normal_gravity(phi, ellipsoid=ellipsoid)
    gravity = normal_gravity(phi, height, ellipsoid=ellipsoid)
    for _ in range(3):
        missing = number - normal_geopotential_number(phi, height, ellipsoid=ellipsoid)
        height = height + missing / gravity
    return plain(height)


def number_of_normal_height(
    height: ArrayLike, latitude: ArrayLike, *, ellipsoid: str = "grs80"
) -> Values:
    """Geopotential number C in m² s⁻² of a normal height in m; inverse of `normal_height`."""
    return normal_geopotential_number(latitude, checked_height(height), ellipsoid=ellipsoid)


def orthometric_height(geopotential_number: ArrayLike, gravity: ArrayLike) -> Values:
    """Orthometric height after Helmert, with gravity measured at the point.

    Parameters
    ----------
    geopotential_number : float or array
        C in m² s⁻².
    gravity : float or array
        Gravity at the surface point in m s⁻².

    Returns
    -------
    float or array
        H in m; dH/dC is 1/(g + 2qH) and dH/dg is -H/(g + 2qH).

    Notes
    -----
    C = (g + q H) H with q = 4.24e-7 s⁻², solved in closed form without cancellation:
    H = 2C/(g + sqrt(g² + 4qC)). Assumes rock of 2670 kg m⁻³ and flat ground; in high mountains the
    result may be off by decimetres from the rigorous height (`rigorous_orthometric_height`).

    Examples
    --------
    >>> round(orthometric_height(4900.0, 9.81), 6)
    499.479533
    """
    number, g = _checked(geopotential_number), checked_gravity(gravity)
    return plain(2 * number / (g + np.sqrt(g**2 + 4 * HELMERT_GRADIENT.value * number)))


def number_of_orthometric_height(height: ArrayLike, gravity: ArrayLike) -> Values:
    """Geopotential number of a Helmert height in m; inverse of `orthometric_height`."""
    h = checked_height(height)
    return plain((checked_gravity(gravity) + HELMERT_GRADIENT.value * h) * h)


def rigorous_orthometric_height(geopotential_number: ArrayLike, mean_gravity: ArrayLike) -> Values:
    """Orthometric height H = C/ḡ in m, with the mean gravity along the plumb line in m s⁻²."""
    return plain(_checked(geopotential_number) / checked_gravity(mean_gravity))


def number_of_rigorous_height(height: ArrayLike, mean_gravity: ArrayLike) -> Values:
    """Geopotential number C = ḡ H; inverse of `rigorous_orthometric_height`."""
    return plain(checked_height(height) * checked_gravity(mean_gravity))


def dynamic_height(
    geopotential_number: ArrayLike, *, reference_gravity: float = DYNAMIC_GRAVITY.value
) -> Values:
    """Dynamic height C/γ45 in m, with one reference gravity (m s⁻²) for the whole Earth."""
    return plain(_checked(geopotential_number) / checked_gravity(reference_gravity))


def number_of_dynamic_height(
    height: ArrayLike, *, reference_gravity: float = DYNAMIC_GRAVITY.value
) -> Values:
    """Geopotential number of a dynamic height in m; inverse of `dynamic_height`."""
    return plain(checked_height(height) * checked_gravity(reference_gravity))


def _checked(geopotential_number: ArrayLike) -> NDArray[np.float64]:
    number = np.asarray(geopotential_number, dtype=np.float64)
    bad = ~((number >= -118_000.0) & (number <= 89_000.0))
    if np.any(bad):
        raise DataError(
            "geopotential number out of range",
            value=float(np.extract(bad, number)[0]),
            allowed="C = W0 - W of a place on Earth in m² s⁻², -118 000 to 89 000",
            advice="Check the unit (1 kgal m = 10 m² s⁻²) and that it is not the potential itself",
        )
    return number
