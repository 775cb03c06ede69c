"""From ellipsoidal heights to geopotential numbers through a geoid height or height anomaly."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from clockgeo.constants import Constant
from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.geopotential import GeopotentialNumber, number_of
from clockgeo.gravity.places import checked_height
from clockgeo.gravity.tide_systems import TideSystem, convert_tide_system
from clockgeo.gravity.zero_levels import ZeroLevel, zero_level

if TYPE_CHECKING:
    from clockgeo.gravity.geoid_model import Quantity

__all__ = [
    "BOUGUER_ANOMALY",
    "Separation",
    "number_from_ellipsoidal_height",
    "require_independent_geoid",
]

BOUGUER_ANOMALY = Constant(
    "Δg_B",
    0.0,
    "m s-2",
    1.5e-3,
    "size of Bouguer anomalies where gravity is not measured (common practice, no source)",
)
_LARGEST = 120.0  # m; the geoid stays within 107 m of the ellipsoid


@dataclass(frozen=True)
class Separation:
    """Height of a zero surface above the ellipsoid at one place.

    Attributes
    ----------
    value, u : float
        m.
    quantity : {"geoid_height", "height_anomaly"}
        Goes with orthometric or with normal heights.
    tide_system : TideSystem
    zero_level : ZeroLevel
        Of the surface; a name or W0 is accepted.
    ellipsoid : str
        The one that heights are counted from.

    Raises
    ------
    ConventionError
        If the quantity is neither.
    DataError
        If the value is beyond 120 m.
    """

    value: float
    u: float
    quantity: Quantity
    tide_system: TideSystem | str
    zero_level: ZeroLevel | str | float
    ellipsoid: str = "grs80"

    def __post_init__(self) -> None:
        if self.quantity not in ("geoid_height", "height_anomaly"):
            raise ConventionError(
                "unknown kind of separation",
                value=repr(self.quantity),
                allowed="geoid_height or height_anomaly",
            )
        if not abs(self.value) <= _LARGEST:
            raise DataError(
                f"{self.quantity} out of range",
                value=self.value,
                allowed="-120 to 120 m",
                advice="If it is in feet or centimetres, convert it to metres",
            )
        if not self.u >= 0.0:
            raise DataError("u of a separation must not be negative", value=self.u)


def number_from_ellipsoidal_height(
    ellipsoidal_height: float,
    separation: Separation,
    *,
    latitude: float,
    height_tide_system: TideSystem | str,
    tide_system: TideSystem | str = TideSystem.MEAN_TIDE,
    u_height: float = 0.0,
    gravity: float | None = None,
    u_gravity: float = 0.0,
) -> GeopotentialNumber:
    """Geopotential number of a mark from its ellipsoidal height.

    Parameters
    ----------
    ellipsoidal_height, u_height : float
        h and its u in m, above the ellipsoid of the separation.
    separation : Separation
        Geoid height or height anomaly at the place.
    latitude : float
        Geodetic latitude in degrees.
    height_tide_system : TideSystem or its text
        Of h; coordinates of the terrestrial reference frame are conventionally tide-free.
    tide_system : TideSystem or its text
        Of the result; clocks are mean-tide.
    gravity, u_gravity : float, optional
        Measured gravity in m s⁻². For geoid heights it makes the orthometric height a number; where
        it is missing, normal gravity is used and `BOUGUER_ANOMALY` enters u.

    Returns
    -------
    GeopotentialNumber
        Counted from the separation's zero level.

    Raises
    ------
    DataError, ConventionError
        If a value is out of range or a convention unknown.

    Notes
    -----
    C = U0 - U(h - ζ), or C = ḡ (h - N) with Helmert's ḡ = g + 4.24e-7 s⁻² H. Height and separation
    are both converted to `tide_system` first.
    """
    checked_height(ellipsoidal_height)
    if not u_height >= 0.0:
        raise DataError("u of a height must not be negative", value=u_height)
    h = convert_tide_system(
        ellipsoidal_height,
        latitude,
        quantity="ellipsoidal_height",
        source=height_tide_system,
        target=tide_system,
    )
    zeta = convert_tide_system(
        separation.value,
        latitude,
        quantity=separation.quantity,
        source=separation.tide_system,
        target=tide_system,
    )
    height = float(h) - float(zeta)
    u = float(np.hypot(u_height, separation.u))
    if separation.quantity == "geoid_height" and gravity is not None:
        value, u_number = number_of(
            height, kind="orthometric", u=u, gravity=gravity, u_gravity=u_gravity
        )
    else:
        value, u_number = number_of(
            height, kind="normal", u=u, latitude=latitude, ellipsoid=separation.ellipsoid
        )
        if separation.quantity == "geoid_height":
            u_number = float(np.hypot(u_number, BOUGUER_ANOMALY.u * height))
    level = zero_level(separation.zero_level)
    return GeopotentialNumber(value, u_number, level, TideSystem(tide_system))


def require_independent_geoid(*, geoid: str, fitted_to: str | None, levelling: str) -> None:
    """Refuse a geoid model as a check of the levelling it was fitted to.

    Parameters
    ----------
    geoid : str
        Name of the geoid model.
    fitted_to : str or None
        The datum a hybrid model was fitted to; None for a gravimetric one.
    levelling : str
        The datum of the levelling that is to be checked.

    Raises
    ------
    ConventionError
        If both are the same datum: the agreement would be the fit's own.
    """
    if fitted_to is not None and fitted_to.strip().casefold() == levelling.strip().casefold():
        raise ConventionError(
            f"the hybrid geoid {geoid} was fitted to {levelling} and cannot check its levelling",
            advice="Use a gravimetric geoid model, or leave this comparison out",
        )
