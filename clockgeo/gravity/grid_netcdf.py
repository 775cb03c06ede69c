"""Geoid grids in CF and COARDS netCDF: any axis names, order, direction and registration."""

from __future__ import annotations

import warnings
from collections.abc import Hashable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ClockgeoError, DataError
from clockgeo.gravity.geoid_conventions import (
    QUANTITY_WORDS,
    crs_from_text,
    ellipsoid_of_axes,
    ellipsoid_of_crs,
    ellipsoid_word,
    metres,
    tide_word,
)
from clockgeo.gravity.grid_content import CONVENTIONS, GridContent, tile_of

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["content_of_dataset", "read_netcdf"]

_USUAL_NAMES = {
    "latitude": ("latitude", "lat", "phi", "y"),
    "longitude": ("longitude", "lon", "long", "lambda", "x"),
}
_PARTS = ("standard_uncertainty", "rate")
"""Values of the attribute `quantity` of variables that belong to another one."""


def read_netcdf(path: Path, *, variable: str | None = None) -> GridContent:
    """Read a geoid grid from a netCDF file.

    Parameters
    ----------
    path : Path
    variable : str, optional
        Which one, where several lie over latitude and longitude.

    Raises
    ------
    DataError
        If the file is damaged, or holds no variable over latitude and longitude, or several.
    ConventionError
        If the values have no metric unit.
    """
    import xarray as xr

    try:
        with warnings.catch_warnings():
            # A variable may name two markers of missing data; both are meant, and both are masked.
            warnings.filterwarnings("ignore", "variable .* has multiple fill values")
            with xr.open_dataset(path, engine=_engine(path), decode_times=False) as dataset:
                return content_of_dataset(dataset.load(), where=path.name, variable=variable)
    except ClockgeoError:
        raise
    except (OSError, RuntimeError, ValueError, IndexError, TypeError, KeyError) as error:
        raise DataError(
            "the netCDF file cannot be read",
            value=error,
            where=path.name,
            advice="It may be cut short: fetch it again and compare its checksum",
        ) from error


def _engine(path: Path) -> str:
    """Engine for the variant of netCDF; the netCDF library itself fills cut classic files up."""
    with path.open("rb") as stream:
        start = stream.read(4)
    if start == b"CDF\x05":
        raise DataError(
            "netCDF of the variant CDF-5 is not read, because a file cut short is not recognised",
            where=path.name,
            advice="Convert it to netCDF-4: nccopy -k nc4",
        )
    return "scipy" if start.startswith(b"CDF") else "netcdf4"


def content_of_dataset(
    dataset: xr.Dataset, *, where: str, variable: str | None = None
) -> GridContent:
    """Take a geoid grid out of an xarray dataset; `where` names it in messages.

    See `read_netcdf` for the other argument and the errors.
    """
    latitude, longitude = (_axis(dataset, axis, where) for axis in _USUAL_NAMES)
    plane = (str(dataset[latitude].dims[0]), str(dataset[longitude].dims[0]))
    heights = _chosen(dataset, plane, variable, where)
    parts = {part: _part(dataset, heights, part, plane, f"{where}, variable") for part in _PARTS}
    tile = tile_of(
        dataset[latitude].values,
        dataset[longitude].values,
        _in_metres(heights, plane, f"{where}, variable"),
        where=f"{where}, variable {heights.name}",
        u=parts["standard_uncertainty"],
        rate=parts["rate"],
        name=str(heights.name),
    )
    return GridContent("CF netCDF", (tile,), _stated(dataset, heights, where))


def _axis(dataset: xr.Dataset, axis: str, where: str) -> str:
    """Name of the one coordinate that is this axis: by its attributes, else by a usual name."""
    import cf_xarray  # noqa: F401  registers the accessor

    found = [*dataset.cf.coordinates.get(axis, []), *dataset.cf.standard_names.get(axis, [])]
    names = sorted({str(name) for name in found if dataset[name].ndim == 1})
    if not names:
        names = [str(n) for n in dataset.coords if str(n).lower() in _USUAL_NAMES[axis]]
    if len(names) != 1 or dataset[names[0]].ndim != 1:
        raise DataError(
            f"no single {axis} axis in the grid",
            value=", ".join(names) or f"variables {', '.join(map(str, dataset.variables))}",
            where=where,
            allowed=f"One 1-D coordinate with the standard name or the units of a {axis}",
        )
    unit = str(dataset[names[0]].attrs.get("units", "degrees")).lower()
    if not unit.startswith("degree"):
        raise DataError(
            f"the {axis} axis is not in degrees",
            value=unit,
            where=f"{where}, variable {names[0]}, attribute units",
        )
    return names[0]


def _chosen(
    dataset: xr.Dataset, plane: tuple[str, str], name: str | None, where: str
) -> xr.DataArray:
    """Variable that holds the heights: the one asked for, named by a convention, or the only."""
    candidates = [
        array.squeeze([d for d in array.dims if array.sizes[d] == 1 and d not in plane])
        for array in dataset.data_vars.values()
        if array.attrs.get("quantity") not in _PARTS and set(plane) <= set(array.dims)
    ]
    candidates = [array for array in candidates if set(array.dims) == set(plane)]
    if name is not None:
        candidates = [array for array in candidates if array.name == name]
    named = [array for array in candidates if _quantity(array)]
    chosen = named if len(named) == 1 else candidates
    if len(chosen) != 1:
        raise DataError(
            "no single variable over latitude and longitude in the grid",
            value=", ".join(str(array.name) for array in candidates) or name or "none",
            where=where,
            allowed="One variable, or one with the standard name of a geoid height",
            advice="Name the one that is meant (variable)",
        )
    return chosen[0]


def _part(
    dataset: xr.Dataset, heights: xr.DataArray, part: str, plane: tuple[str, str], where: str
) -> NDArray[np.floating] | None:
    """Ancillary field of the heights: their u, or their rate."""
    for name in str(heights.attrs.get("ancillary_variables", "")).split():
        if name not in dataset:
            continue
        array = dataset[name]
        is_error = str(array.attrs.get("standard_name", "")).endswith("standard_error")
        if array.attrs.get("quantity") == part or (is_error and part == "standard_uncertainty"):
            return _in_metres(array, plane, where)
    return None


def _in_metres(array: xr.DataArray, plane: tuple[str, str], where: str) -> NDArray[np.floating]:
    """Values over (latitude, longitude) in m, or m a year."""
    unit = str(array.attrs.get("units", "")).replace("/", " ").split()
    if array.attrs.get("quantity") == "rate":
        unit = unit[:1] if unit[1:] in (["year-1"], ["yr-1"], ["year"], ["yr"]) else ["unknown"]
    factor = metres(" ".join(unit), f"{where} {array.name}, attribute units")
    values = np.asarray(array.transpose(*plane).values)
    return values if factor == 1.0 else values * factor


def _quantity(array: xr.DataArray) -> str | None:
    words = (array.attrs.get(key) for key in ("quantity", "standard_name"))
    return next((QUANTITY_WORDS[w] for w in words if w in QUANTITY_WORDS), None)


def _stated(dataset: xr.Dataset, heights: xr.DataArray, where: str) -> dict[str, str]:
    attributes: dict[Hashable, Any] = {**dataset.attrs, **heights.attrs}
    stated = {name: str(attributes[name]) for name in CONVENTIONS if name in attributes}
    stated.pop("quantity", None)
    quantity, ellipsoid = _quantity(heights), _ellipsoid(dataset, heights, where)
    if quantity:
        stated["quantity"] = quantity
    if "ellipsoid" in stated:
        stated["ellipsoid"] = ellipsoid_word(stated["ellipsoid"])
    elif ellipsoid:
        stated["ellipsoid"] = ellipsoid
    if "tide_system" in stated:
        stated["tide_system"] = tide_word(stated["tide_system"])
    title = attributes.get("references") or attributes.get("title")
    return {**stated, "source": str(title)} if title else stated


def _ellipsoid(dataset: xr.Dataset, heights: xr.DataArray, where: str) -> str | None:
    """Ellipsoid that the grid mapping names, describes in WKT or gives the axes of."""
    name = heights.encoding.get("grid_mapping") or heights.attrs.get("grid_mapping")
    if name not in dataset.variables:
        return None
    mapping = dataset[name].attrs
    if "reference_ellipsoid_name" in mapping:
        return ellipsoid_word(str(mapping["reference_ellipsoid_name"]))
    if "crs_wkt" in mapping:
        return ellipsoid_of_crs(crs_from_text(str(mapping["crs_wkt"]), f"{where}, variable {name}"))
    if {"semi_major_axis", "inverse_flattening"} <= set(mapping):
        return ellipsoid_of_axes(
            float(mapping["semi_major_axis"]), float(mapping["inverse_flattening"])
        )
    return None
