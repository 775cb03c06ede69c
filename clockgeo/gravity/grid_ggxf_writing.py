"""Writing geoid models as OGC GGXF 1.0 (netCDF-4 carrier)."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ConventionError, DataError
from clockgeo.files import netcdf_file, whole_file
from clockgeo.gravity.geoid_model import GeoidModel
from clockgeo.gravity.grid_ggxf import HEIGHT_PARAMETERS, OWN_PREFIX, RATE_PARAMETER, YEAR
from clockgeo.gravity.grid_tile import GridTile

__all__ = ["write_ggxf"]

_CRS_CODES = {"grs80": 4019, "wgs84": 4326}
"""Ellipsoid -> EPSG code of a geographic CRS on it, axes north and east."""


def write_ggxf(
    model: GeoidModel,
    path: str | Path,
    *,
    first_index: Literal["latitude", "longitude"] = "latitude",
    replace: bool = False,
) -> None:
    """Write a geoid model as GGXF; values keep their precision.

    Parameters
    ----------
    model : GeoidModel
    path : path
    first_index : {"latitude", "longitude"}
        Which axis the node number i runs along (from north to south, or from west to east); the
        affine coefficients say it, and readers must not care.
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    ConventionError
        If the model's ellipsoid is none that a CRS is written for.
    DataError
        If a nested tile lies in no tile above it.
    OutputError
        If the file exists and `replace` is false, or cannot be written.

    Notes
    -----
    The standard has no field for tide system, zero level and error model. They are written as
    global attributes that begin with `clockgeo_`, and in words as the remark of the target CRS.
    """
    if model.ellipsoid not in _CRS_CODES:
        raise ConventionError(
            "no CRS is known for the ellipsoid of the model",
            value=model.ellipsoid,
            where=model.name,
            allowed=", ".join(_CRS_CODES),
        )
    parents = _parents(model)
    with whole_file(path, replace=replace) as partial, netcdf_file(partial) as out:
        for name, value in _head(model):
            out.setncattr(name, value)
        groups: dict[int, Any] = {-1: out.createGroup("geoid")}
        groups[-1].interpolationMethod = model.interpolation
        for number in sorted(parents, key=lambda place: model.tiles[place].depth):
            tile = model.tiles[number]
            groups[number] = groups[parents[number]].createGroup(tile.name or f"grid{number}")
            _write_tile(groups[number], tile, model, first_index)


def _parents(model: GeoidModel) -> dict[int, int]:
    """Place of each tile -> place of the tile it is nested in, -1 for none."""
    parents = {}
    for number, tile in enumerate(model.tiles):
        above = [
            place
            for place, other in enumerate(model.tiles)
            if other.depth == tile.depth - 1 and _holds(other, tile)
        ]
        if tile.depth > 0 and not above:
            raise DataError(
                "a nested grid lies in no grid above it", value=tile.name, where=model.name
            )
        parents[number] = above[0] if above else -1
    return parents


def _holds(outer: GridTile, inner: GridTile) -> bool:
    slack = 1e-6 * inner.latitude_step
    east = (inner.west - outer.west + slack) % 360.0 - slack
    in_longitude = outer.closes or east + inner.width <= outer.width + slack
    return (
        in_longitude and outer.south - slack <= inner.south and inner.north <= outer.north + slack
    )


def _head(model: GeoidModel) -> Iterator[tuple[str, Any]]:
    from pyproj import CRS

    crs = CRS.from_epsg(_CRS_CODES[model.ellipsoid])
    yield "Conventions", "GGXF-1.0, ACDD-1.3"
    yield "content", "geoidModel"
    yield "title", model.source or model.name
    yield "interpolationCrsWkt", crs.to_wkt()
    yield "sourceCrsWkt", crs.to_3d().to_wkt()
    yield "targetCrsWkt", _vertical_crs(model)
    parameters = list(_parameters(model))
    yield "parameters.count", np.int32(len(parameters))
    for number, (name, unit, ratio) in enumerate(parameters):
        yield f"parameters.{number}.parameterName", name
        yield f"parameters.{number}.sourceCrsAxis", np.int32(2)
        yield f"parameters.{number}.unitName", unit
        yield f"parameters.{number}.unitSiRatio", ratio
    for name, value in model.conventions.items():
        yield OWN_PREFIX + name, value


def _parameters(model: GeoidModel) -> Iterator[tuple[str, str, float]]:
    """Name, unit and SI ratio of what the grids hold."""
    name = HEIGHT_PARAMETERS[model.quantity]
    yield name, "metre", 1.0
    if any(tile.u is not None for tile in model.tiles):
        yield f"{name}Uncertainty", "metre", 1.0
    if any(tile.rate is not None for tile in model.tiles):
        yield RATE_PARAMETER, "metre per year", 1.0 / YEAR


def _vertical_crs(model: GeoidModel) -> str:
    kind = "normal" if model.quantity == "height_anomaly" else "orthometric"
    remark = f"{model.tide_system}, zero level {model.zero_level.name}".replace('"', "'")
    return (
        f'VERTCRS["{kind} height of the model",VDATUM["zero surface of the model"],'
        'CS[vertical,1],AXIS["gravity-related height (H)",up],LENGTHUNIT["metre",1],'
        f'REMARK["{remark}"]]'
    )


def _write_tile(grid: Any, tile: GridTile, model: GeoidModel, first_index: str) -> None:
    along_latitude = first_index == "latitude"
    rows, columns = tile.values.shape
    grid.createDimension("iNodeCount", rows if along_latitude else columns)
    grid.createDimension("jNodeCount", columns if along_latitude else rows)
    if tile.priority:
        grid.gridPriority = np.int32(tile.priority)
    name = HEIGHT_PARAMETERS[model.quantity]
    fields = {name: tile.values, f"{name}Uncertainty": tile.u, RATE_PARAMETER: tile.rate}
    for parameter, values in fields.items():
        if values is not None:
            _write_values(grid, parameter, values[::-1] if along_latitude else values.T)
    if along_latitude:
        coefficients = (tile.north, -tile.latitude_step, 0.0, tile.west, 0.0, tile.longitude_step)
    else:
        coefficients = (tile.south, 0.0, tile.latitude_step, tile.west, tile.longitude_step, 0.0)
    grid.affineCoeffs = np.array(coefficients)


def _write_values(grid: Any, name: str, values: NDArray[np.floating]) -> None:
    kind = "f4" if values.dtype == np.float32 else "f8"
    variable = grid.createVariable(
        name, kind, ("iNodeCount", "jNodeCount"), compression="zlib", fill_value=np.nan
    )
    variable[:] = values
