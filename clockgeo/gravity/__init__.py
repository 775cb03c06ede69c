"""The gravity wing: potentials, heights, tide systems, tides and geoid grids.

The names below are imported from their modules on first use, so that importing this package costs
next to nothing.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from clockgeo.gravity.caution import CAUTION
    from clockgeo.gravity.tide_systems import (
        TidalQuantity,
        TideSystem,
        convert_tide_system,
        mean_tide_height_evrf2019,
        permanent_tide_potential,
        require_same_tide_system,
        tide_system_shift,
        zero_tide_height_evrf2019,
    )
    from clockgeo.gravity.zero_levels import (
        ZeroLevel,
        convert_zero_level,
        named_zero_levels,
        require_same_zero_level,
        zero_level,
        zero_level_shift,
    )

__all__ = [
    "CAUTION",
    "TidalQuantity",
    "TideSystem",
    "ZeroLevel",
    "convert_tide_system",
    "convert_zero_level",
    "mean_tide_height_evrf2019",
    "named_zero_levels",
    "permanent_tide_potential",
    "require_same_tide_system",
    "require_same_zero_level",
    "tide_system_shift",
    "zero_level",
    "zero_level_shift",
    "zero_tide_height_evrf2019",
]

_HOME = {
    "CAUTION": "caution",
    "TidalQuantity": "tide_systems",
    "TideSystem": "tide_systems",
    "convert_tide_system": "tide_systems",
    "mean_tide_height_evrf2019": "tide_systems",
    "permanent_tide_potential": "tide_systems",
    "require_same_tide_system": "tide_systems",
    "tide_system_shift": "tide_systems",
    "zero_tide_height_evrf2019": "tide_systems",
    "ZeroLevel": "zero_levels",
    "convert_zero_level": "zero_levels",
    "named_zero_levels": "zero_levels",
    "require_same_zero_level": "zero_levels",
    "zero_level": "zero_levels",
    "zero_level_shift": "zero_levels",
}
"""Public name -> module of this package that defines it."""


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        message = f"module {__name__!r} has no attribute {name!r}"
        raise AttributeError(message)
    return getattr(importlib.import_module(f"{__name__}.{_HOME[name]}"), name)


def __dir__() -> list[str]:
    return sorted(__all__)
