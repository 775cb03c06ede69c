"""A tile and its conventions as an xarray dataset after the CF conventions."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.errors import ConventionError
from clockgeo.gravity.grid_tile import GridTile

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["dataset_of_tile"]

_STANDARD_NAMES = {"geoid_height": "geoid_height_above_reference_ellipsoid"}
_LONG_NAMES = {
    "geoid_height": "geoid height above the reference ellipsoid",
    "height_anomaly": "height anomaly, quasigeoid above the reference ellipsoid",
}
_ELLIPSOID_NAMES = {"grs80": "GRS 1980", "wgs84": "WGS 84"}
_PLANE = ("latitude", "longitude")


def dataset_of_tile(
    tile: GridTile, conventions: Mapping[str, Any], *, title: str = ""
) -> xr.Dataset:
    """Make a dataset of a tile.

    Parameters
    ----------
    tile : GridTile
    conventions : mapping
        What is stated, by the names of `CONVENTIONS`; becomes attributes of the main variable.
    title : str
        Of the model.

    Returns
    -------
    xarray.Dataset
        The main variable is named after the quantity, or `zero_surface_height` where none is
        stated; with it `<name>_u` and `<name>_rate` as ancillary variables, and the grid mapping.
    """
    import xarray as xr

    name = str(conventions.get("quantity", "zero_surface_height"))
    attributes: dict[str, Any] = {"units": "m", **conventions}
    if name in _LONG_NAMES:
        attributes["long_name"] = _LONG_NAMES[name]
    if name in _STANDARD_NAMES:
        attributes["standard_name"] = _STANDARD_NAMES[name]
    variables: dict[str, Any] = {name: (_PLANE, tile.values, attributes)}
    if tile.u is not None:
        words = {"units": "m", "long_name": "standard uncertainty"}
        if name in _STANDARD_NAMES:
            words["standard_name"] = f"{_STANDARD_NAMES[name]} standard_error"
        variables[f"{name}_u"] = (_PLANE, tile.u, {**words, "quantity": "standard_uncertainty"})
    if tile.rate is not None:
        words = {"units": "m year-1", "long_name": "rate of change", "quantity": "rate"}
        variables[f"{name}_rate"] = (_PLANE, tile.rate, words)
    if len(variables) > 1:
        attributes["ancillary_variables"] = " ".join(n for n in variables if n != name)
    if "ellipsoid" in conventions:
        attributes["grid_mapping"] = "crs"
        variables["crs"] = ((), np.int32(0), _grid_mapping(str(conventions["ellipsoid"])))
    north = {"units": "degrees_north", "standard_name": "latitude", "axis": "Y"}
    east = {"units": "degrees_east", "standard_name": "longitude", "axis": "X"}
    axes = {
        "latitude": ("latitude", tile.latitudes, north),
        "longitude": ("longitude", tile.longitudes, east),
    }
    head = {"Conventions": "CF-1.12"}
    return xr.Dataset(variables, axes, {**head, "title": title} if title else head)


def _grid_mapping(ellipsoid: str) -> dict[str, Any]:
    from clockgeo.gravity.normal_field import reference_ellipsoid

    mapping: dict[str, Any] = {
        "grid_mapping_name": "latitude_longitude",
        "reference_ellipsoid_name": _ELLIPSOID_NAMES.get(ellipsoid, ellipsoid),
    }
    try:
        body = reference_ellipsoid(ellipsoid)
    except ConventionError:  # one without a gravity field here; its name says what it is
        return mapping
    mapping["semi_major_axis"] = float(body.semimajor_axis)
    mapping["inverse_flattening"] = 1.0 / float(body.flattening)
    return mapping
