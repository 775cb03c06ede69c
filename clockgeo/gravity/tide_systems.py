"""Tide systems as types, and the explicit conversions between them.

The Moon and the Sun raise a potential whose time average, the permanent tide Wp, is not zero. A
quantity is *mean-tide* if it keeps Wp and what Wp does to the Earth, *zero-tide* if Wp itself is
removed but the Earth stays deformed by it, and *tide-free* if the deformation is removed too (with
conventional Love numbers). Time-averaged clock data are mean-tide.
"""

from __future__ import annotations

from collections.abc import Mapping
from enum import StrEnum
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.constants import Constant
from clockgeo.errors import ConventionError
from clockgeo.gravity.normal_field import geocentric_radius, normal_gravity
from clockgeo.gravity.places import checked_latitude, plain

__all__ = [
    "CONVENTIONAL_H2",
    "CONVENTIONAL_K2",
    "EVRF2019_MEAN_TIDE_ORIGIN",
    "TidalQuantity",
    "TideSystem",
    "convert_tide_system",
    "mean_tide_height_evrf2019",
    "permanent_tide_potential",
    "require_same_tide_system",
    "tide_system",
    "tide_system_shift",
    "zero_tide_height_evrf2019",
]


class TideSystem(StrEnum):
    """How the permanent tide is treated; carried by every potential, height and grid."""

    MEAN_TIDE = "mean_tide"
    ZERO_TIDE = "zero_tide"
    TIDE_FREE = "tide_free"


class TidalQuantity(StrEnum):
    """What is converted between tide systems."""

    POTENTIAL = "potential"
    """W, m² s⁻²."""
    GEOPOTENTIAL_NUMBER = "geopotential_number"
    """C = W0 - W with one W0 for all systems, m² s⁻²."""
    PHYSICAL_HEIGHT = "physical_height"
    """Normal, orthometric or dynamic height H, m."""
    GEOID_HEIGHT = "geoid_height"
    """N, m."""
    HEIGHT_ANOMALY = "height_anomaly"
    """ζ, m."""
    ELLIPSOIDAL_HEIGHT = "ellipsoidal_height"
    """h of a mark on the crust, m; mean and zero crust are the same."""
    GRAVITY = "gravity"
    """g of a mark on the crust, m s⁻²."""


CONVENTIONAL_K2 = Constant(
    "k2", 0.30190, "1", 0.0, "conventional value of the permanent tide, IERS Conventions 2010 ch. 6"
)
CONVENTIONAL_H2 = Constant(
    "h2", 0.6078, "1", 0.0, "nominal degree-2 value, IERS Conventions 2010 ch. 7"
)
EVRF2019_MEAN_TIDE_ORIGIN = Constant(
    "H_T(origin)",
    -0.08593,
    "m",
    0.0,
    "EPSG method 1107 (EVRF2019): keeps the height of the nominal origin; it differs between "
    "documents",
)

_PERMANENT = (0.9722, -2.8841, -0.0195)  # m2 s-2, Makinen & Ihde 2009, IAG Symposia 133
_EVRF2019 = (-0.0994, 0.29541, 0.00042)  # m, EPSG method 1107


def _in_sine_squared(coefficients: tuple[float, ...], latitude: ArrayLike) -> NDArray[np.float64]:
    sine_squared = np.sin(np.radians(checked_latitude(latitude))) ** 2
    return np.asarray(np.polynomial.polynomial.polyval(sine_squared, coefficients))


def permanent_tide_potential(latitude: ArrayLike) -> float | NDArray[np.float64]:
    """Permanent tide-generating potential Wp on the GRS80 ellipsoid.

    Parameters
    ----------
    latitude : float or array
        Geodetic latitude in degrees.

    Returns
    -------
    float or array
        Wp in m² s⁻², the direct part alone (no Love numbers); 0.97 at the equator, -1.93 at a pole.

    Raises
    ------
    DataError
        If a latitude lies outside -90..90.

    Notes
    -----
    Wp = 0.9722 - 2.8841 sin²φ - 0.0195 sin⁴φ (Mäkinen and Ihde 2009, IAG Symposia 133), the time
    average of the ephemeris tide within 5e-4 m² s⁻². Up to 9 km of height it changes by 0.3 %, less
    than 6e-3 m² s⁻²; the convention leaves that out.

    Examples
    --------
    >>> round(permanent_tide_potential(52.0), 4)
    -0.8262
    """
    return plain(_in_sine_squared(_PERMANENT, latitude))


def tide_system_shift(
    quantity: TidalQuantity | str,
    latitude: ArrayLike,
    *,
    source: TideSystem | str,
    target: TideSystem | str,
    fixed_in: Literal["crust", "space"] = "crust",
    datum_latitude: float | None = None,
) -> float | NDArray[np.float64]:
    """Amount to add to a quantity in the tide system `source` to have it in `target`.

    Parameters
    ----------
    quantity : TidalQuantity or its text
        What is converted; the unit of the result is the quantity's.
    latitude : float or array
        Geodetic latitude in degrees.
    source, target : TideSystem or its text
        From which system, and into which.
    fixed_in : {"crust", "space"}
        For `potential` and `geopotential_number`: whether the point is a mark that moves with the
        crust (all sites; then C, h, N and H stay consistent, H = h - N, in each system) or a point
        of given coordinates. Differs for `tide_free` only.
    datum_latitude : float, optional
        Latitude of a datum point that keeps its number in both systems; its own shift is taken off.
        Allowed for geopotential numbers and physical heights.

    Returns
    -------
    float or array

    Raises
    ------
    ConventionError
        If a system or quantity is unknown, or an option does not go with the quantity.
    DataError
        If a latitude lies outside -90..90.

    Notes
    -----
    With k = 0.30190, h = 0.6078, δ = 1 + h - 3k/2, geocentric radius r and normal gravity γ of the
    ellipsoid: W_mean = W_zero + Wp; W_zero = W_free + k Wp in space and + (k - h) Wp on the crust;
    C changes as -W, H as -W/γ of the crust; N_mean = N_zero + Wp/γ, N_zero = N_free + k Wp/γ;
    h_mean = h_zero = h_free + h Wp/γ; g_mean = g_zero - 2 Wp/r, g_zero = g_free - (δ - 1) 2 Wp/r.
    Ekman 1989, Bull. Géod. 63:281; Mäkinen 2021, J. Geod. 95:106. Round trips return the value.
    """
    what = _quantity(quantity)
    start, end = tide_system(source), tide_system(target)
    if fixed_in not in ("crust", "space"):
        raise ConventionError(
            "unknown kind of point", value=repr(fixed_in), allowed="Use crust or space"
        )
    permanent = np.asarray(permanent_tide_potential(latitude))
    factor = _content(what, end, fixed_in) - _content(what, start, fixed_in)
    shift = factor * permanent * _per_potential(what, latitude)
    if datum_latitude is not None:
        if what not in (TidalQuantity.GEOPOTENTIAL_NUMBER, TidalQuantity.PHYSICAL_HEIGHT):
            raise ConventionError(
                "a datum latitude goes with geopotential numbers and physical heights only",
                value=what.value,
            )
        shift = shift - tide_system_shift(
            what, datum_latitude, source=start, target=end, fixed_in=fixed_in
        )
    return plain(shift)


def convert_tide_system(
    value: ArrayLike,
    latitude: ArrayLike,
    *,
    quantity: TidalQuantity | str,
    source: TideSystem | str,
    target: TideSystem | str,
    fixed_in: Literal["crust", "space"] = "crust",
    datum_latitude: float | None = None,
) -> float | NDArray[np.float64]:
    """Convert `value` from the tide system `source` to `target`; see `tide_system_shift`.

    Examples
    --------
    >>> mean = convert_tide_system(
    ...     748.0, 52.3, quantity="geopotential_number", source="zero_tide", target="mean_tide"
    ... )
    >>> round(mean, 4)
    748.841
    """
    shift = tide_system_shift(
        quantity,
        latitude,
        source=source,
        target=target,
        fixed_in=fixed_in,
        datum_latitude=datum_latitude,
    )
    return plain(np.asarray(value, dtype=np.float64) + shift)


def mean_tide_height_evrf2019(
    zero_tide_height: ArrayLike, latitude: ArrayLike
) -> float | NDArray[np.float64]:
    """Mean-tide height of EVRF2019 from the zero-tide one, both in m (EPSG method 1107).

    Notes
    -----
    H_mean = H_zero + 0.29541 sin²φ + 0.00042 sin⁴φ - 0.0994 - 0.08593 m. The last constant
    (`EVRF2019_MEAN_TIDE_ORIGIN`) belongs to this realization; it is not a matter of physics.
    """
    return plain(np.asarray(zero_tide_height, dtype=np.float64) + _evrf2019_shift(latitude))


def zero_tide_height_evrf2019(
    mean_tide_height: ArrayLike, latitude: ArrayLike
) -> float | NDArray[np.float64]:
    """Zero-tide height of EVRF2019 from the mean-tide one, in m; inverse of EPSG method 1107."""
    return plain(np.asarray(mean_tide_height, dtype=np.float64) - _evrf2019_shift(latitude))


def require_same_tide_system(parties: Mapping[str, TideSystem | str]) -> TideSystem:
    """Return the tide system that all `parties` state, or refuse to go on.

    Parameters
    ----------
    parties : mapping
        Who says which system, such as ``{"campaign": "mean_tide", "grid a.nc": "zero_tide"}``.

    Raises
    ------
    ConventionError
        If two of them differ; names both.
    """
    stated = {name: tide_system(system) for name, system in parties.items()}
    (first_name, first), *others = stated.items()
    for name, system in others:
        if system is not first:
            raise ConventionError(
                f"tide systems do not agree: {first_name} is {first}, {name} is {system}",
                advice="Convert one of them explicitly, or correct what is stated",
            )
    return first


def _evrf2019_shift(latitude: ArrayLike) -> NDArray[np.float64]:
    return _in_sine_squared(_EVRF2019, latitude) + EVRF2019_MEAN_TIDE_ORIGIN.value


def _content(quantity: TidalQuantity, system: TideSystem, fixed_in: str) -> float:
    """How much of Wp the quantity holds in that system, counted from zero-tide."""
    k, h = CONVENTIONAL_K2.value, CONVENTIONAL_H2.value
    mean, free = {
        TidalQuantity.POTENTIAL: (1.0, h - k if fixed_in == "crust" else -k),
        TidalQuantity.GEOPOTENTIAL_NUMBER: (-1.0, k - h if fixed_in == "crust" else k),
        TidalQuantity.PHYSICAL_HEIGHT: (-1.0, k - h),
        TidalQuantity.GEOID_HEIGHT: (1.0, -k),
        TidalQuantity.HEIGHT_ANOMALY: (1.0, -k),
        TidalQuantity.ELLIPSOIDAL_HEIGHT: (0.0, -h),
        TidalQuantity.GRAVITY: (1.0, -(h - 1.5 * k)),
    }[quantity]
    return {TideSystem.MEAN_TIDE: mean, TideSystem.ZERO_TIDE: 0.0, TideSystem.TIDE_FREE: free}[
        system
    ]


def _per_potential(quantity: TidalQuantity, latitude: ArrayLike) -> NDArray[np.float64]:
    """Unit of the quantity per m² s⁻² of Wp."""
    if quantity in (TidalQuantity.POTENTIAL, TidalQuantity.GEOPOTENTIAL_NUMBER):
        return np.asarray(1.0)
    if quantity is TidalQuantity.GRAVITY:
        return np.asarray(-2.0 / geocentric_radius(latitude))
    return np.asarray(1.0 / normal_gravity(latitude))


def tide_system(stated: TideSystem | str) -> TideSystem:
    """Tide system by its text.

    Raises
    ------
    ConventionError
        If the text is none of `mean_tide`, `zero_tide` and `tide_free`.
    """
    try:
        return TideSystem(stated)
    except ValueError:
        raise ConventionError(
            "unknown tide system",
            value=repr(stated),
            allowed=f"One of {', '.join(TideSystem)}",
        ) from None


def _quantity(stated: TidalQuantity | str) -> TidalQuantity:
    try:
        return TidalQuantity(stated)
    except ValueError:
        raise ConventionError(
            "unknown quantity for a change of tide system",
            value=repr(stated),
            allowed=f"One of {', '.join(TidalQuantity)}",
        ) from None
