"""The words of grid files for quantities, tide systems, ellipsoids and units, in one place."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.gravity.zero_levels import ZeroLevel, named_zero_levels, zero_level

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = [
    "QUANTITY_WORDS",
    "crs_from_text",
    "ellipsoid_of_axes",
    "ellipsoid_of_crs",
    "ellipsoid_word",
    "metres",
    "same_level",
    "stated_level",
    "tide_word",
]

QUANTITY_WORDS = {
    "geoid_height": "geoid_height",
    "geoid_height_above_reference_ellipsoid": "geoid_height",
    "geoid": "geoid_height",
    "geoidHeight": "geoid_height",
    "height_anomaly": "height_anomaly",
    "quasi-geoid": "height_anomaly",
    "quasigeoid": "height_anomaly",
    "heightAnomaly": "height_anomaly",
}
"""CF standard name, ISG data type, GGXF parameter or our own word -> quantity."""

_METRES = {
    **dict.fromkeys(("m", "metre", "metres", "meter", "meters"), 1.0),
    **dict.fromkeys(("cm", "centimetre", "centimetres", "centimeter", "centimeters"), 1e-2),
    **dict.fromkeys(("mm", "millimetre", "millimetres", "millimeter", "millimeters"), 1e-3),
}
_AXES = {(6_378_137.0, 298.257222101): "grs80", (6_378_137.0, 298.257223563): "wgs84"}


def metres(unit: str | None, where: str) -> float:
    """Metres in the unit of a grid's values.

    Raises
    ------
    ConventionError
        If no unit is stated, or one that is no metric length.
    """
    text = (unit or "").strip().lower()
    if text not in _METRES:
        raise ConventionError(
            "the unit of the grid's values is not metric" if text else "the grid states no unit",
            value=unit or None,
            where=where,
            allowed="m, cm or mm",
            advice="Convert the values, or state their unit in the file",
        )
    return _METRES[text]


def tide_word(text: str) -> str:
    """Our word for a tide system in a usual spelling; any other text as it is."""
    plain = re.sub(r"[^a-z]", "", text.lower()).removesuffix("system")
    known = {
        "tidefree": TideSystem.TIDE_FREE,
        "freetide": TideSystem.TIDE_FREE,
        "nontidal": TideSystem.TIDE_FREE,
        "zerotide": TideSystem.ZERO_TIDE,
        "meantide": TideSystem.MEAN_TIDE,
    }
    return str(known.get(plain, text))


def ellipsoid_word(name: str) -> str:
    """Short name of an ellipsoid from one of its usual spellings.

    Examples
    --------
    >>> ellipsoid_word("GRS 1980"), ellipsoid_word("WGS 84"), ellipsoid_word("Bessel 1841")
    ('grs80', 'wgs84', 'bessel 1841')
    """
    plain = re.sub(r"[^a-z0-9]", "", name.lower())
    known = {"grs1980": "grs80", "grs80": "grs80", "wgs1984": "wgs84", "wgs84": "wgs84"}
    return known.get(plain, name.strip().lower())


def ellipsoid_of_axes(semi_major_axis: float, inverse_flattening: float) -> str | None:
    """Short name of the ellipsoid of these parameters (m, 1), if it is a known one."""
    for (a, f), name in _AXES.items():
        if abs(a - semi_major_axis) < 1e-3 and abs(f - inverse_flattening) < 5e-7:
            return name
    return None


def ellipsoid_of_crs(crs: CRS) -> str | None:
    """Short name of the ellipsoid of a coordinate reference system."""
    return None if crs.ellipsoid is None else ellipsoid_word(crs.ellipsoid.name)


def crs_from_text(text: str, where: str) -> CRS:
    """Geographic coordinate reference system from WKT.

    Raises
    ------
    DataError
        If the text is missing, no CRS, or not a geographic one.
    """
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    try:
        crs = CRS.from_wkt(text)
    except CRSError:
        raise DataError(
            "the coordinate reference system of the grid cannot be read",
            value=repr(text[:60]) if text else "missing",
            where=where,
            allowed="A geographic CRS in WKT",
        ) from None
    if not crs.is_geographic:
        raise DataError(
            "the grid is not in geographic coordinates",
            value=crs.name,
            where=where,
            allowed="A geographic CRS in WKT",
        )
    return crs


def stated_level(stated: Mapping[str, Any], where: str) -> ZeroLevel | None:
    """Zero level that a file states by a name, a potential, or both.

    A name that is not one of ours is a local datum's own; its potential may be unknown.

    Raises
    ------
    ConventionError
        If name and potential contradict each other, or the potential is none.
    """
    name, potential = stated.get("zero_level"), stated.get("zero_level_potential")
    if potential is None:
        return None if name is None else _named_level(str(name), where)
    try:
        w0 = float(potential)
    except ValueError:
        raise ConventionError(
            "the zero level is no number",
            value=repr(potential),
            where=f"{where}, field zero_level_potential",
        ) from None
    if name is None:
        return zero_level(w0)
    level = _named_level(str(name), where)
    if level.w0 is None:
        return ZeroLevel(level.name, w0, source=level.source)
    if not same_level(level, zero_level(w0)):
        raise ConventionError(
            "name and potential of the zero level contradict each other",
            value=f"{name}, {w0!r} m² s⁻²",
            where=f"{where}, fields zero_level and zero_level_potential",
        )
    return level


def _named_level(text: str, where: str) -> ZeroLevel:
    if text in named_zero_levels():
        return zero_level(text)
    try:
        return zero_level(float(text))
    except ValueError:
        return ZeroLevel(text, None, source=f"stated in {where}")


def same_level(first: ZeroLevel, second: ZeroLevel) -> bool:
    """Whether two zero levels are one, to 1e-4 m² s⁻² (10 µm)."""
    if first.w0 is None or second.w0 is None:
        return first.name == second.name
    return abs(first.w0 - second.w0) < 1e-4
