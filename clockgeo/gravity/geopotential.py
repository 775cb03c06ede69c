"""Geopotential numbers that know their conventions, and heights with their uncertainty."""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import heights as formulas
from clockgeo.gravity.normal_field import normal_gravity
from clockgeo.gravity.places import checked_gravity
from clockgeo.gravity.tide_systems import (
    TideSystem,
    require_same_tide_system,
    tide_system,
    tide_system_shift,
)
from clockgeo.gravity.zero_levels import (
    ZeroLevel,
    require_same_zero_level,
    zero_level,
    zero_level_shift,
)

__all__ = ["GeopotentialNumber", "Height", "HeightKind", "height_of", "heights_of", "number_of"]


class HeightKind(StrEnum):
    """The three heights that are made from a geopotential number."""

    NORMAL = "normal"
    ORTHOMETRIC = "orthometric"
    DYNAMIC = "dynamic"


@dataclass(frozen=True)
class Height:
    """A height with its standard uncertainty and its derivatives.

    Attributes
    ----------
    kind : HeightKind
    value, u : float
        m.
    per_potential : float
        dH/dC in m per m² s⁻².
    per_gravity : float
        dH/dg in m per m s⁻²; 0 where gravity does not enter.
    """

    kind: HeightKind
    value: float
    u: float
    per_potential: float
    per_gravity: float = 0.0


@dataclass(frozen=True)
class GeopotentialNumber:
    """C = W0 - W of a point with its conventions; grows with height.

    Attributes
    ----------
    value, u : float
        m² s⁻².
    zero_level : ZeroLevel
        What C is counted from; a name or W0 is accepted and looked up.
    tide_system : TideSystem
    """

    value: float
    u: float
    zero_level: ZeroLevel
    tide_system: TideSystem

    def __post_init__(self) -> None:
        if not self.u >= 0.0:
            raise ConventionError("u of a geopotential number must not be negative", value=self.u)
        object.__setattr__(self, "zero_level", zero_level(self.zero_level))
        object.__setattr__(self, "tide_system", tide_system(self.tide_system))

    def counted_from(self, level: ZeroLevel | str | float) -> GeopotentialNumber:
        """Count the same point from another zero level; u of a measured W0 is added.

        Raises
        ------
        ConventionError
            If the potential of one of the levels is not known.
        """
        target = zero_level(level)
        if target == self.zero_level:
            return self
        shift = zero_level_shift(source=self.zero_level, target=target)
        u = float(np.hypot(self.u, np.hypot(self.zero_level.u, target.u)))
        return replace(self, value=self.value + shift, u=u, zero_level=target)

    def in_tide_system(self, system: TideSystem | str, *, latitude: float) -> GeopotentialNumber:
        """Give the number of the same mark in another tide system; `latitude` in degrees."""
        shift = tide_system_shift(
            "geopotential_number", latitude, source=self.tide_system, target=system
        )
        return replace(self, value=self.value + float(shift), tide_system=tide_system(system))

    def above(self, other: GeopotentialNumber) -> float:
        """Difference to `other` in m² s⁻², positive if this point is higher.

        Raises
        ------
        ConventionError
            If zero levels or tide systems differ.
        """
        require_same_zero_level({"one number": self.zero_level, "the other": other.zero_level})
        require_same_tide_system({"one number": self.tide_system, "the other": other.tide_system})
        return self.value - other.value


def height_of(
    geopotential_number: float,
    *,
    kind: HeightKind | str,
    u: float = 0.0,
    latitude: float | None = None,
    gravity: float | None = None,
    u_gravity: float = 0.0,
    mean_gravity: float | None = None,
    ellipsoid: str = "grs80",
) -> Height:
    """Height of one kind with u and derivatives from a geopotential number.

    Parameters
    ----------
    geopotential_number, u : float
        C and its standard uncertainty in m² s⁻².
    kind : HeightKind or its text
        `normal` needs `latitude`; `orthometric` needs `gravity` at the point (Helmert) or
        `mean_gravity` along the plumb line (rigorous); `dynamic` needs nothing.
    latitude : float, optional
        Geodetic latitude in degrees.
    gravity, mean_gravity : float, optional
        m s⁻².
    u_gravity : float
        Standard uncertainty of the gravity used, m s⁻².
    ellipsoid : str
        Ellipsoid of the normal heights.

    Raises
    ------
    ConventionError
        If the kind is unknown or what it needs is missing.
    DataError
        If a value is out of range.

    Examples
    --------
    >>> height_of(748.0, kind="normal", u=0.1, latitude=52.3).u  # doctest: +ELLIPSIS
    0.01019...
    """
    wanted = _kind(kind)
    _check_uncertainties(u, u_gravity)
    if wanted is HeightKind.NORMAL:
        phi = _needed(latitude, wanted, "latitude")
        value = float(formulas.normal_height(geopotential_number, phi, ellipsoid=ellipsoid))
        slope = 1.0 / float(normal_gravity(phi, value, ellipsoid=ellipsoid))
        return Height(wanted, value, abs(slope) * u, slope)
    if wanted is HeightKind.DYNAMIC:
        slope = 1.0 / formulas.DYNAMIC_GRAVITY.value
        value = float(formulas.dynamic_height(geopotential_number))
        return Height(wanted, value, slope * u, slope)
    if mean_gravity is not None:
        value = float(formulas.rigorous_orthometric_height(geopotential_number, mean_gravity))
        slope, per_gravity = 1.0 / mean_gravity, -value / mean_gravity
    else:
        g = float(checked_gravity(_needed(gravity, wanted, "gravity")))
        value = float(formulas.orthometric_height(geopotential_number, g))
        slope = 1.0 / (g + 2 * formulas.HELMERT_GRADIENT.value * value)
        per_gravity = -value * slope
    total = float(np.hypot(slope * u, per_gravity * u_gravity))
    return Height(wanted, value, total, slope, per_gravity)


def heights_of(
    geopotential_number: float,
    *,
    latitude: float,
    u: float = 0.0,
    gravity: float | None = None,
    u_gravity: float = 0.0,
    ellipsoid: str = "grs80",
) -> dict[HeightKind, Height]:
    """All heights that can be made: normal and dynamic, and orthometric where gravity is known.

    See `height_of` for the arguments.
    """
    kinds = [HeightKind.NORMAL, HeightKind.DYNAMIC]
    if gravity is not None:
        kinds.insert(1, HeightKind.ORTHOMETRIC)
    return {
        kind: height_of(
            geopotential_number,
            kind=kind,
            u=u,
            latitude=latitude,
            gravity=gravity,
            u_gravity=u_gravity,
            ellipsoid=ellipsoid,
        )
        for kind in kinds
    }


def number_of(
    height: float,
    *,
    kind: HeightKind | str,
    u: float = 0.0,
    latitude: float | None = None,
    gravity: float | None = None,
    u_gravity: float = 0.0,
    mean_gravity: float | None = None,
    ellipsoid: str = "grs80",
) -> tuple[float, float]:
    """Geopotential number C and its u in m² s⁻² of a height in m; inverse of `height_of`.

    Parameters and errors are those of `height_of`, with `u` in m.
    """
    wanted = _kind(kind)
    _check_uncertainties(u, u_gravity)
    if wanted is HeightKind.NORMAL:
        phi = _needed(latitude, wanted, "latitude")
        number = formulas.number_of_normal_height(height, phi, ellipsoid=ellipsoid)
    elif wanted is HeightKind.DYNAMIC:
        number = formulas.number_of_dynamic_height(height)
    elif mean_gravity is not None:
        number = formulas.number_of_rigorous_height(height, mean_gravity)
    else:
        number = formulas.number_of_orthometric_height(height, _needed(gravity, wanted, "gravity"))
    there = height_of(
        float(number),
        kind=wanted,
        latitude=latitude,
        gravity=gravity,
        mean_gravity=mean_gravity,
        ellipsoid=ellipsoid,
    )
    spread = float(np.hypot(u, there.per_gravity * u_gravity)) / there.per_potential
    return float(number), spread


def _kind(stated: HeightKind | str) -> HeightKind:
    try:
        return HeightKind(stated)
    except ValueError:
        raise ConventionError(
            "unknown kind of height", value=repr(stated), allowed=f"One of {', '.join(HeightKind)}"
        ) from None


def _check_uncertainties(*uncertainties: float) -> None:
    for u in uncertainties:
        if not 0.0 <= u < np.inf:
            raise DataError("a standard uncertainty must not be negative", value=u)


def _needed(value: float | None, kind: HeightKind, name: str) -> float:
    if value is None:
        raise ConventionError(
            f"{kind} heights need the {name} of the point",
            advice="Give geodetic latitude in degrees or measured gravity in m s⁻²; "
            "neither can be guessed",
        )
    return value
