"""From the marker a height is known for to the atoms of the clock: short and long transfers.

A geopotential number grows by g dz + (dg/dz) dz²/2 over a vertical distance dz. Over a metre the
linear term does; over a tower of 450 m the quadratic one is 0.31 m² s⁻² (3.5e-18, 3.2 cm).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from clockgeo.constants import GRAVITATIONAL_CONSTANT, ROCK_DENSITY, Constant
from clockgeo.errors import DataError
from clockgeo.gravity.normal_field import normal_geopotential_number, normal_gravity
from clockgeo.gravity.places import checked_gravity, checked_height
from clockgeo.tables import NonNegative, Positive, Table, Uncertainty

__all__ = [
    "FREE_AIR_GRADIENT",
    "RockLayer",
    "SiteTransfer",
    "marker_to_atoms",
    "normal_field_transfer",
    "shaft_transfer",
]

FREE_AIR_GRADIENT = Constant(
    "dg/dz",
    -3.086e-6,
    "s-2",
    3.1e-7,
    "mean free-air gradient of the normal field; 10 % for buildings and terrain (common practice, "
    "no source)",
)
_GRAVITY_ANOMALY = 1e-3  # m s-2: spread of surface gravity about the normal field (100 mGal)


@dataclass(frozen=True)
class SiteTransfer:
    """Potential difference of a transfer within a site.

    Attributes
    ----------
    geopotential_difference, u : float
        C at the end minus C at the start, and its standard uncertainty; m² s⁻².
    quadratic_term : float
        What gravity times distance alone would have missed, m² s⁻².
    gravity_at_end : float
        m s⁻².
    method : str
        `gradient`, `normal_field` or `rock_layers`.
    """

    geopotential_difference: float
    u: float
    quadratic_term: float
    gravity_at_end: float
    method: str

    def __float__(self) -> float:
        return self.geopotential_difference


class RockLayer(Table):
    """A layer of ground between two levels of a shaft."""

    thickness: Positive
    """Vertical extent in m."""
    density: NonNegative = ROCK_DENSITY.value
    """kg m⁻³; 0 for an open hall."""
    u_density: Uncertainty = ROCK_DENSITY.u
    """Standard uncertainty of the density, kg m⁻³."""


def marker_to_atoms(
    dz: float,
    *,
    gravity: float,
    u_dz: float = 0.0,
    u_gravity: float = 0.0,
    gradient: float | None = None,
    u_gradient: float | None = None,
) -> SiteTransfer:
    """Potential difference from a marker to the atoms by measured gravity and its gradient.

    Parameters
    ----------
    dz, u_dz : float
        Height of the atoms above the marker and its u, m; negative below.
    gravity, u_gravity : float
        Gravity at the marker and its u, m s⁻².
    gradient, u_gradient : float, optional
        Vertical gradient dg/dz and its u, s⁻² (negative in free air). Without a measured one the
        mean free-air gradient is used with a u of 10 % (`FREE_AIR_GRADIENT`).

    Returns
    -------
    SiteTransfer

    Raises
    ------
    DataError
        If dz is beyond 2000 m, gravity out of range or the gradient implausible.

    Notes
    -----
    ΔC = g dz + (dg/dz) dz²/2. Denker et al. 2018, J. Geod. 92:487. 1 m at g known to 1e-3 m s⁻²
    is good to 1e-3 m² s⁻².

    Examples
    --------
    >>> round(marker_to_atoms(1.2, gravity=9.8125).geopotential_difference, 5)
    11.775
    """
    g = float(checked_gravity(gravity))
    _check_distance(dz)
    measured = gradient is not None
    slope = gradient if gradient is not None else FREE_AIR_GRADIENT.value
    if not abs(slope) <= 1e-5:
        raise DataError(
            "vertical gravity gradient out of range",
            value=slope,
            allowed="dg/dz in s⁻², about -3.1e-6 in free air and -0.85e-6 in rock",
            advice="If the value is in mGal/m, multiply it by 1e-5",
        )
    if u_gradient is None:
        u_gradient = 0.0 if measured else FREE_AIR_GRADIENT.u
    _check_uncertainties(u_dz, u_gravity, u_gradient)
    end = g + slope * dz
    quadratic = slope * dz**2 / 2
    u = math.hypot(end * u_dz, dz * u_gravity, dz**2 / 2 * u_gradient)
    return SiteTransfer(g * dz + quadratic, u, quadratic, end, "gradient")


def normal_field_transfer(
    latitude: float,
    start: float,
    end: float,
    *,
    u_gravity: float = _GRAVITY_ANOMALY,
    ellipsoid: str = "grs80",
) -> SiteTransfer:
    """Potential difference between two heights at one place by the normal field, in closed form.

    Parameters
    ----------
    latitude : float
        Geodetic latitude in degrees.
    start, end : float
        Heights of the two ends in m.
    u_gravity : float
        Spread of real gravity about the normal field, m s⁻²; without a measurement 1e-3 (100 mGal).
    ellipsoid : str
        Name of the reference ellipsoid.

    Examples
    --------
    >>> round(normal_field_transfer(35.71, 30.0, 480.0).geopotential_difference, 6)
    4408.720269
    """
    _check_distance(end - start)
    _check_uncertainties(u_gravity)
    upper = normal_geopotential_number(latitude, checked_height(end), ellipsoid=ellipsoid)
    lower = normal_geopotential_number(latitude, checked_height(start), ellipsoid=ellipsoid)
    difference = float(upper) - float(lower)
    g_start = float(normal_gravity(latitude, start, ellipsoid=ellipsoid))
    g_end = float(normal_gravity(latitude, end, ellipsoid=ellipsoid))
    quadratic = difference - g_start * (end - start)
    return SiteTransfer(difference, abs(end - start) * u_gravity, quadratic, g_end, "normal_field")


def shaft_transfer(
    layers: Sequence[RockLayer],
    *,
    gravity: float,
    direction: Literal["down", "up"] = "down",
    u_gravity: float = 0.0,
    gradient: float = FREE_AIR_GRADIENT.value,
    u_gradient: float = FREE_AIR_GRADIENT.u,
) -> SiteTransfer:
    """Potential difference along a shaft through layers of rock.

    Parameters
    ----------
    layers : sequence of RockLayer
        In the order they are passed.
    gravity, u_gravity : float
        Gravity where the transfer starts and its u, m s⁻².
    direction : {"down", "up"}
        Which way the transfer goes.
    gradient, u_gradient : float
        Free-air gradient above the ground and its u, s⁻².

    Raises
    ------
    DataError
        If there is no layer, the depth exceeds 2000 m or gravity is out of range.

    Notes
    -----
    Within a layer of density ρ the gradient is that of free air plus 4πGρ (Poincaré and Prey), for
    layers that are wide against their depth; the shaft itself is neglected. Heiskanen and Moritz
    1967, section 4-3.

    Examples
    --------
    >>> layer = RockLayer(thickness=100.0, density=2670.0)
    >>> round(shaft_transfer([layer], gravity=9.81).geopotential_difference, 4)
    -981.0042
    """
    if not layers:
        raise DataError("a shaft needs at least one layer", allowed="Layers in the order passed")
    if direction not in ("down", "up"):
        raise DataError("unknown direction", value=repr(direction), allowed="Use down or up")
    depth = sum(layer.thickness for layer in layers)
    _check_distance(depth)
    _check_uncertainties(u_gravity, u_gradient)
    g = start = float(checked_gravity(gravity))
    sign = 1.0 if direction == "up" else -1.0
    pull = 4 * math.pi * GRAVITATIONAL_CONSTANT.value
    total, variance, remaining = (
        0.0,
        (depth * u_gravity) ** 2 + (depth**2 / 2 * u_gradient) ** 2,
        depth,
    )
    for layer in layers:
        step = sign * layer.thickness
        slope = gradient + pull * layer.density
        total += g * step + slope * step**2 / 2
        g += slope * step
        remaining -= layer.thickness
        lever = layer.thickness * (layer.thickness / 2 + remaining)
        variance += (pull * layer.u_density * lever) ** 2
    return SiteTransfer(total, math.sqrt(variance), total - sign * start * depth, g, "rock_layers")


def _check_distance(dz: float) -> None:
    if not abs(dz) <= 2000.0:
        raise DataError(
            "a transfer within a site is at most 2000 m high",
            value=dz,
            allowed="Vertical distance in m",
            advice="Check the unit; treat more distant points as sites of their own",
        )


def _check_uncertainties(*uncertainties: float) -> None:
    for u in uncertainties:
        if not 0.0 <= u < math.inf:
            raise DataError("an uncertainty must not be negative", value=u)
