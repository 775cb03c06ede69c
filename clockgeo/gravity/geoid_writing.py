"""Writing geoid models: CF netCDF with every convention in an attribute, GGXF and GTX."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.errors import DataError
from clockgeo.files import write_dataset
from clockgeo.gravity.geoid_model import GeoidModel
from clockgeo.gravity.grid_dataset import dataset_of_tile
from clockgeo.gravity.grid_ggxf_writing import write_ggxf
from clockgeo.gravity.grid_gtx import write_gtx
from clockgeo.gravity.grid_tile import GridTile

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["geoid_dataset", "write_geoid"]

_FILL = np.int32(-2_147_483_648)


def geoid_dataset(model: GeoidModel) -> xr.Dataset:
    """Return a model of one tile as an xarray dataset after the CF conventions.

    Raises
    ------
    DataError
        If the model has several tiles, which CF has no place for.
    """
    tile = _only_tile(model, "CF netCDF")
    return dataset_of_tile(tile, model.conventions, title=model.source)


def write_geoid(
    model: GeoidModel, path: str | Path, *, resolution: float | None = None, replace: bool = False
) -> None:
    """Write a geoid model; the ending chooses CF netCDF (.nc), GGXF (.ggxf) or GTX (.gtx).

    Parameters
    ----------
    model : GeoidModel
    path : path
        GTX has no place for conventions, u and rate: they are lost, and values become float32.
    resolution : float, optional
        For CF netCDF: round the values to multiples of this, in m, and pack them as integers; they
        are then at most half of it off. Without it they keep their precision.
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    DataError
        If the ending is unknown, a nested model goes to a format of one grid, or a resolution does
        not go with the format or the values.
    OutputError
        If the file exists and `replace` is false, or cannot be written.
    """
    target = Path(path)
    kind = target.suffix.lower()
    if resolution is not None and (kind != ".nc" or not 1e-7 <= resolution <= 0.1):
        raise DataError(
            "no such resolution",
            value=f"{resolution} m for {target.name}",
            allowed="1e-7 to 0.1 m, for CF netCDF",
        )
    if kind == ".ggxf":
        write_ggxf(model, target, replace=replace)
    elif kind == ".gtx":
        write_gtx(_only_tile(model, "GTX"), target, replace=replace)
    elif kind == ".nc":
        _write_netcdf(geoid_dataset(model), target, resolution, replace=replace)
    else:
        raise DataError(
            "no grid format that is written has this ending",
            value=target.name,
            allowed=".nc (CF netCDF), .ggxf (OGC GGXF) or .gtx",
        )


def _only_tile(model: GeoidModel, kind: str) -> GridTile:
    if len(model.tiles) != 1:
        raise DataError(
            f"a nested model does not fit into one {kind} grid",
            value=f"{len(model.tiles)} grids",
            where=model.name,
            advice="Write it as GGXF",
        )
    return model.tiles[0]


def _write_netcdf(
    dataset: xr.Dataset, target: Path, resolution: float | None, *, replace: bool
) -> None:
    shrunk: dict[str, Any] = {"zlib": True, "complevel": 9, "shuffle": True}
    encoding: dict[Any, dict[str, Any]] = {
        name: {**shrunk, "_FillValue": np.nan}
        for name, array in dataset.data_vars.items()
        if array.ndim == 2
    }
    if resolution is not None:
        main = next(iter(dataset.data_vars))
        # Rounding single precision to the step would add its own error.
        dataset[main] = dataset[main].astype(np.float64)
        encoding[main] = {
            **shrunk,
            "dtype": "int32",
            "scale_factor": resolution,
            "_FillValue": _FILL,
        }
        dataset[main].attrs["comment"] = (
            f"values are multiples of {resolution:g} m, at most {resolution / 2:g} m off"
        )
    encoding |= {axis: {"_FillValue": None} for axis in ("latitude", "longitude")}
    write_dataset(target, dataset, replace=replace, encoding=encoding)
