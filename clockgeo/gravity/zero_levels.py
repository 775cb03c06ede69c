"""Zero levels: the potential W0 from which a geopotential number C = W0 - W is counted.

A clock corrected to the time scale and a height of the height reference differ by 2.6005 m² s⁻²
(2.9e-17, 26.5 cm) if their zero levels are mixed up; therefore every number names its own.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.constants import W0_HEIGHT_REFERENCE, W0_TIME_SCALE
from clockgeo.errors import ConventionError
from clockgeo.gravity.normal_field import reference_ellipsoid
from clockgeo.gravity.places import plain

__all__ = [
    "ZeroLevel",
    "convert_zero_level",
    "named_zero_levels",
    "require_same_zero_level",
    "zero_level",
    "zero_level_shift",
]

_PLAUSIBLE = (62_636_500.0, 62_637_200.0)  # m2 s-2: W0 of any real datum, within 35 m of the geoid
_SAME = 1e-4  # m2 s-2, 10 µm: two values closer than this are the same level


@dataclass(frozen=True)
class ZeroLevel:
    """A named zero of geopotential numbers.

    Attributes
    ----------
    name : str
        `time_scale`, `height_reference`, an ellipsoid (`grs80`, `wgs84`) or a datum's own name.
    w0 : float or None
        Potential in m² s⁻²; None for a local datum whose potential is not known.
    u : float
        Standard uncertainty of `w0` in m² s⁻²; 0 for defined values.
    source : str
        Where the value comes from.

    Raises
    ------
    ConventionError
        If `w0` is not the potential of any sea level, or `u` is negative.
    """

    name: str
    w0: float | None
    u: float = 0.0
    source: str = "stated by the user"

    def __post_init__(self) -> None:
        if self.w0 is not None and not _PLAUSIBLE[0] <= self.w0 <= _PLAUSIBLE[1]:
            raise ConventionError(
                "not the potential of a zero level",
                value=self.w0,
                where=f"zero level {self.name}",
                allowed="W0 in m² s⁻² between 62 636 500 and 62 637 200",
                advice="Give W0 itself, not an offset, in m² s⁻² (1 kgal m = 10 m² s⁻²)",
            )
        if not (self.u >= 0.0 and math.isfinite(self.u)):
            raise ConventionError(
                "u of a zero level must not be negative",
                value=self.u,
                where=f"zero level {self.name}",
            )


def named_zero_levels() -> dict[str, ZeroLevel]:
    """Every zero level that has a name of its own: `time_scale`, `height_reference`, ellipsoids."""
    return {level.name: level for level in _named()}


@cache
def _named() -> tuple[ZeroLevel, ...]:
    levels = [
        ZeroLevel("time_scale", W0_TIME_SCALE.value, W0_TIME_SCALE.u, W0_TIME_SCALE.source),
        ZeroLevel(
            "height_reference",
            W0_HEIGHT_REFERENCE.value,
            W0_HEIGHT_REFERENCE.u,
            W0_HEIGHT_REFERENCE.source,
        ),
    ]
    for name in ("grs80", "wgs84"):
        ellipsoid = reference_ellipsoid(name)
        levels.append(
            ZeroLevel(
                name,
                float(ellipsoid.reference_normal_gravity_potential),
                source=f"normal potential of the ellipsoid {ellipsoid.name}",
            )
        )
    return tuple(levels)


def zero_level(stated: str | float | ZeroLevel) -> ZeroLevel:
    """Find a zero level by its name or by its potential.

    Parameters
    ----------
    stated : str, float or ZeroLevel
        A name of `named_zero_levels`, or W0 in m² s⁻² as a number or its text. A value that equals
        a named one (to 1e-4) is that one; any other becomes a level of its own, named after it.

    Raises
    ------
    ConventionError
        If the name is unknown or the value is no W0.

    Examples
    --------
    >>> zero_level("height_reference").w0
    62636853.4
    >>> zero_level(62636853.4).name
    'height_reference'
    """
    if isinstance(stated, ZeroLevel):
        return stated
    named = named_zero_levels()
    if isinstance(stated, str) and stated in named:
        return named[stated]
    try:
        w0 = float(stated)
    except ValueError:
        raise ConventionError(
            "unknown zero level",
            value=repr(stated),
            allowed=f"One of {', '.join(named)}, or W0 as a number in m² s⁻²",
        ) from None
    for level in named.values():
        if level.w0 is not None and abs(level.w0 - w0) < _SAME:
            return level
    return ZeroLevel(f"W0 = {w0!r}", w0)


def zero_level_shift(*, source: ZeroLevel | str | float, target: ZeroLevel | str | float) -> float:
    """Amount in m² s⁻² to add to a geopotential number above `source` to count it from `target`.

    Raises
    ------
    ConventionError
        If a level is unknown, or the potential of a local datum is not known.

    Examples
    --------
    >>> round(zero_level_shift(source="height_reference", target="time_scale"), 4)
    2.6005
    """
    start, end = zero_level(source), zero_level(target)
    if _same(start, end):
        return 0.0
    for level in (start, end):
        if level.w0 is None:
            raise ConventionError(
                f"the potential of the zero level {level.name} is not known",
                advice="State its W0, or let adjust estimate the offset of the datum",
            )
    assert start.w0 is not None
    assert end.w0 is not None
    return end.w0 - start.w0


def convert_zero_level(
    geopotential_number: ArrayLike,
    *,
    source: ZeroLevel | str | float,
    target: ZeroLevel | str | float,
) -> float | NDArray[np.float64]:
    """Count a geopotential number from another zero level: C' = C + W0' - W0, in m² s⁻².

    See `zero_level_shift` for the arguments and errors.
    """
    shift = zero_level_shift(source=source, target=target)
    return plain(np.asarray(geopotential_number, dtype=np.float64) + shift)


def require_same_zero_level(parties: Mapping[str, ZeroLevel | str | float]) -> ZeroLevel:
    """Return the zero level that all `parties` state, or refuse to go on.

    Parameters
    ----------
    parties : mapping
        Who counts from which level, such as ``{"site A": "time_scale", "geoid": "grs80"}``.

    Raises
    ------
    ConventionError
        If two of them differ; names both and the difference.
    """
    stated = {name: zero_level(level) for name, level in parties.items()}
    (first_name, first), *others = stated.items()
    for name, level in others:
        if not _same(first, level):
            raise ConventionError(
                f"zero levels do not agree: {first_name} counts from {first.name}, "
                f"{name} from {level.name}",
                value=_difference(first, level),
                advice="Convert one of them explicitly, or correct what is stated",
            )
    return first


def _same(first: ZeroLevel, second: ZeroLevel) -> bool:
    if first.w0 is None or second.w0 is None:
        return first.w0 is second.w0 and first.name == second.name
    return abs(first.w0 - second.w0) < _SAME


def _difference(first: ZeroLevel, second: ZeroLevel) -> str | None:
    if first.w0 is None or second.w0 is None:
        return None
    return f"they differ by {second.w0 - first.w0:.4f} m² s⁻²"
