"""Reading geoid grids in OGC GGXF 1.0 (netCDF-4 carrier): nested groups, affine coefficients.

Standard: OGC 22-051r7. A GGXF group holds grids as nested netCDF groups; each grid has the
dimensions iNodeCount and jNodeCount, a variable named after a parameter or a set of parameters, and
six affine coefficients that turn node numbers into coordinates of the interpolation CRS in the axis
order of that CRS. Which index runs along latitude is for the coefficients to say.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ClockgeoError, DataError
from clockgeo.gravity.geoid_conventions import (
    QUANTITY_WORDS,
    crs_from_text,
    ellipsoid_of_crs,
    tide_word,
)
from clockgeo.gravity.grid_content import CONVENTIONS, GridContent, first_wins, tile_of
from clockgeo.gravity.grid_tile import GridTile

__all__ = ["HEIGHT_PARAMETERS", "OWN_PREFIX", "RATE_PARAMETER", "YEAR", "is_ggxf", "read_ggxf"]

HEIGHT_PARAMETERS = {"geoid_height": "geoidHeight", "height_anomaly": "heightAnomaly"}
RATE_PARAMETER = "geoidVelocity"
YEAR = 31_556_925.445
"""Seconds in the year that the unit metre per year of the EPSG registry (1042) refers to."""

OWN_PREFIX = "clockgeo_"
"""Prefix of global attributes for what GGXF has no field for: tide system, zero level, errors."""


@dataclass(frozen=True)
class _Parameter:
    """Where a parameter stands: its variable, its place in a set, and its unit in SI."""

    name: str
    variable: str
    place: int | None
    si_ratio: float


def is_ggxf(path: Path) -> bool:
    """Whether a netCDF file states the GGXF convention."""
    import netCDF4

    try:
        with netCDF4.Dataset(path) as dataset:
            return "GGXF" in str(getattr(dataset, "Conventions", ""))
    except OSError:
        return False


def read_ggxf(path: Path) -> GridContent:
    """Read all grids of a GGXF geoid model.

    Raises
    ------
    DataError
        If the file is damaged, or a required field is missing or odd; names the grid and the field.
    """
    import netCDF4

    try:
        with netCDF4.Dataset(path) as dataset:
            return _content(dataset, path.name)
    except ClockgeoError:
        raise
    except (OSError, RuntimeError, IndexError) as error:
        raise DataError(
            "the GGXF file cannot be read",
            value=error,
            where=path.name,
            advice="It may be cut short: fetch it again and compare its checksum",
        ) from error


def _content(dataset: Any, where: str) -> GridContent:
    parameters = _parameters(dataset)
    heights = [p for p in parameters if p.name in HEIGHT_PARAMETERS.values()]
    if len(heights) != 1:
        raise DataError(
            "no single geoid height among the GGXF parameters",
            value=", ".join(p.name for p in parameters) or "none",
            where=f"{where}, parameters",
            allowed=" or ".join(HEIGHT_PARAMETERS.values()),
        )
    field = f"{where}, interpolationCrsWkt"
    crs = crs_from_text(str(getattr(dataset, "interpolationCrsWkt", "")), field)
    latitude_first = crs.axis_info[0].direction.lower() == "north"
    wanted = {
        "values": heights[0],
        "u": _named(parameters, f"{heights[0].name}Uncertainty"),
        "rate": _a_year(_named(parameters, RATE_PARAMETER)),
    }
    tiles = [
        _tile(grid, depth, wanted, latitude_first, where)
        for grid, depth in _grids(dataset, heights[0].variable)
    ]
    if not tiles:
        raise DataError(
            "no grid in the GGXF file",
            where=where,
            allowed=f"A nested group with a variable {heights[0].variable}",
        )
    stated = _stated(dataset, heights[0].name)
    stated.setdefault("ellipsoid", ellipsoid_of_crs(crs) or "")
    return GridContent("GGXF", first_wins(tiles), {k: v for k, v in stated.items() if v})


def _parameters(dataset: Any) -> list[_Parameter]:
    """Parameters from their flattened attributes `parameters.N.field`, in their order."""
    found: dict[int, dict[str, Any]] = {}
    for attribute in dataset.ncattrs():
        root, *rest = attribute.split(".")
        if root == "parameters" and len(rest) == 2 and rest[0].isdigit():
            found.setdefault(int(rest[0]), {})[rest[1]] = dataset.getncattr(attribute)
    parameters, filled = [], dict[str, int]()
    for _, fields in sorted(found.items()):
        name, group = str(fields.get("parameterName", "")), fields.get("parameterSet")
        place = None
        if group is not None:
            place = filled.get(str(group), 0)
            filled[str(group)] = place + 1
        ratio = float(fields.get("unitSiRatio", 1.0))
        parameters.append(_Parameter(name, str(group or name), place, ratio))
    return parameters


def _named(parameters: list[_Parameter], name: str) -> _Parameter | None:
    return next((p for p in parameters if p.name == name), None)


def _a_year(rate: _Parameter | None) -> _Parameter | None:
    """Let a rate count in metres a year rather than a second."""
    if rate is None:
        return None
    ratio = rate.si_ratio * YEAR
    return replace(rate, si_ratio=1.0 if abs(ratio - 1.0) < 1e-6 else ratio)


def _grids(group: Any, variable: str, depth: int = 0) -> Iterator[tuple[Any, int]]:
    """Groups that hold the variable, each with its depth in the nest."""
    for child in group.groups.values():
        is_grid = variable in child.variables
        if is_grid:
            yield child, depth
        yield from _grids(child, variable, depth + is_grid)


def _tile(
    grid: Any,
    depth: int,
    wanted: dict[str, _Parameter | None],
    latitude_first: bool,
    where: str,
) -> GridTile:
    place = f"{where}, grid {grid.name}"
    coefficients = np.asarray(getattr(grid, "affineCoeffs", ()), dtype=np.float64).ravel()
    if coefficients.size != 6:
        raise DataError(
            "a GGXF grid needs six affine coefficients",
            value=coefficients.size,
            where=f"{place}, affineCoeffs",
        )
    pair = coefficients[:3], coefficients[3:]
    latitude, longitude = pair if latitude_first else pair[::-1]
    # i runs along latitude if the latitude does not depend on j, and the other way round.
    latitude_along_i = latitude[2] == 0.0 and longitude[1] == 0.0
    latitude_along_j = latitude[1] == 0.0 and longitude[2] == 0.0
    if latitude_along_i == latitude_along_j:
        raise DataError(
            "a GGXF grid is not aligned with its meridians",
            value=", ".join(f"{c:g}" for c in coefficients),
            where=f"{place}, affineCoeffs",
        )
    fields = {
        name: None if parameter is None else _values(grid, parameter, latitude_along_i, place)
        for name, parameter in wanted.items()
    }
    heights = fields["values"]
    assert heights is not None
    rows, columns = heights.shape
    return tile_of(
        latitude[0] + (latitude[1] + latitude[2]) * np.arange(rows),
        longitude[0] + (longitude[1] + longitude[2]) * np.arange(columns),
        heights,
        where=place,
        u=fields["u"],
        rate=fields["rate"],
        name=grid.name,
        depth=depth,
        priority=int(getattr(grid, "gridPriority", 0)),
    )


def _values(
    grid: Any, parameter: _Parameter, latitude_along_i: bool, where: str
) -> NDArray[np.floating] | None:
    """Values of a parameter over (latitude, longitude) in SI units, NaN where there is none."""
    if parameter.variable not in grid.variables:
        return None
    variable = grid.variables[parameter.variable]
    nodes = ("iNodeCount", "jNodeCount")
    others = [d for d in variable.dimensions if d not in nodes]
    if not set(nodes) <= set(variable.dimensions) or len(others) > 1:
        raise DataError(
            "the dimensions of a GGXF variable are not those of a grid",
            value=", ".join(variable.dimensions),
            where=f"{where}, variable {parameter.variable}",
            allowed="iNodeCount, jNodeCount and at most a count of parameters",
        )
    stored = variable[:]
    if others:
        stored = np.ma.take(stored, parameter.place or 0, axis=variable.dimensions.index(others[0]))
    kept = [d for d in variable.dimensions if d in nodes]
    kind = np.float32 if stored.dtype == np.float32 else np.float64
    values = np.asarray(np.ma.filled(stored.astype(kind), np.nan))
    if kept != [*nodes] if latitude_along_i else kept == [*nodes]:
        values = values.T
    return values if parameter.si_ratio == 1.0 else values * parameter.si_ratio


def _stated(dataset: Any, parameter: str) -> dict[str, str]:
    stated = {
        name: str(dataset.getncattr(OWN_PREFIX + name))
        for name in CONVENTIONS
        if OWN_PREFIX + name in dataset.ncattrs()
    }
    stated["quantity"] = QUANTITY_WORDS[parameter]
    if "tide_system" in stated:
        stated["tide_system"] = tide_word(stated["tide_system"])
    methods = {str(getattr(g, "interpolationMethod", "")).lower() for g in dataset.groups.values()}
    if len(methods) == 1 and methods != {""}:
        stated.setdefault("interpolation", methods.pop())
    title = str(getattr(dataset, "title", ""))
    return {"source": title, **stated} if title else stated
