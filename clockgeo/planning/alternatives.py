"""What spirit levelling and GNSS with a geoid model would reach over the same distances."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.campaign.plan_schema import OtherTechniques
from clockgeo.levelling.stations import Site

__all__ = ["break_even_distance", "distance_between", "u_of_gnss_geoid", "u_of_levelling"]


def u_of_levelling(techniques: OtherTechniques, distance: ArrayLike) -> NDArray[np.float64]:
    """Standard uncertainty in m of a spirit-levelled height difference over `distance` in m.

    Notes
    -----
    √(s² L + k² L²), s per root of a kilometre and k per kilometre; the systematic part grows with
    the distance. Random part as in every text on levelling; a wander of the systematic part is not
    modelled.
    """
    kilometres = np.asarray(distance, dtype=np.float64) / 1e3
    random = techniques.levelling_per_root_km**2 * kilometres
    return np.sqrt(random + (techniques.levelling_per_km * kilometres) ** 2)


def u_of_gnss_geoid(techniques: OtherTechniques, distance: ArrayLike) -> NDArray[np.float64]:
    """Standard uncertainty in m of a height difference from GNSS and a geoid model.

    Notes
    -----
    √2 √(u_h² + u_N² (1 - r)), with the correlation r = exp(-d/D) of the geoid's errors at the two
    ends where a correlation length D is stated, else r = 0.
    """
    metres = np.asarray(distance, dtype=np.float64)
    length = techniques.geoid_correlation_length
    alike = np.zeros_like(metres) if length is None else np.exp(-metres / length)
    single = techniques.u_gnss**2 + techniques.u_geoid**2 * (1.0 - alike)
    return np.asarray(np.sqrt(2.0 * single))


def break_even_distance(techniques: OtherTechniques, u: float) -> float | None:
    """Distance in m beyond which levelling is less certain than `u` (m); None where it never is.

    Notes
    -----
    Solves s² L + k² L² = u²; L = (u/s)² for k = 0.
    """
    s2, k2 = techniques.levelling_per_root_km**2, techniques.levelling_per_km**2
    if s2 == 0.0 and k2 == 0.0:
        return None
    # The root of the quadratic in a form that holds for k = 0 and loses no digits.
    return 1e3 * 2.0 * u**2 / (s2 + float(np.sqrt(s2**2 + 4.0 * k2 * u**2)))


def distance_between(first: Site, second: Site) -> float:
    """Shortest distance in m between two sites on the GRS80 ellipsoid."""
    from pyproj import Geod

    return float(
        Geod(ellps="GRS80").inv(first.longitude, first.latitude, second.longitude, second.latitude)[
            2
        ]
    )
