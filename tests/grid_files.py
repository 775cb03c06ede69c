"""The same grid in every format, written by hand: readers meet none of the project's writers."""

from __future__ import annotations

import struct
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

CONVENTIONS = {
    "quantity": "height_anomaly",
    "tide_system": "zero_tide",
    "zero_level": "height_reference",
    "ellipsoid": "grs80",
}


@dataclass(frozen=True)
class Grid:
    """Nodes from south to north and west to east; NaN for no data."""

    south: float
    west: float
    latitude_step: float
    longitude_step: float
    values: np.ndarray

    @property
    def latitudes(self) -> np.ndarray:
        return self.south + self.latitude_step * np.arange(self.values.shape[0])

    @property
    def longitudes(self) -> np.ndarray:
        return self.west + self.longitude_step * np.arange(self.values.shape[1])

    @property
    def north(self) -> float:
        return float(self.latitudes[-1])

    @property
    def east(self) -> float:
        return float(self.longitudes[-1])


def invented_grid(seed: int = 5) -> Grid:
    """Islands of data across the antimeridian: a corner and a hole have none."""
    rng = np.random.default_rng(seed)
    values = np.float32(30.0 + rng.normal(0.0, 3.0, (41, 61)).cumsum(axis=1) / 4.0)
    values[:6, :9] = np.nan
    values[20:23, 30:33] = np.nan
    return Grid(-20.0, 173.0, 0.25, 0.25, values)


def small_grid() -> Grid:
    """A plane over a corner of an invented land; north and east can be told apart."""
    phi, lam = np.meshgrid(np.arange(4.0), np.arange(5.0), indexing="ij")
    return Grid(46.0, 10.0, 0.5, 0.25, np.float32(40.0 + phi + 0.1 * lam))


def write_cf(path: Path, grid: Grid, *, edit: Callable[[Any], Any] | None = None) -> Path:
    """Write CF netCDF through plain xarray; `edit` changes the dataset before that."""
    import xarray as xr

    attributes = {"units": "m", **CONVENTIONS}
    dataset = xr.Dataset(
        {"zeta": (("lat", "lon"), grid.values, attributes)},
        {
            "lat": ("lat", grid.latitudes, {"units": "degrees_north"}),
            "lon": ("lon", grid.longitudes, {"units": "degrees_east"}),
        },
    )
    if edit is not None:
        dataset = edit(dataset)
    dataset.to_netcdf(path, engine="netcdf4")
    return path


def write_gtx(path: Path, grid: Grid) -> Path:
    header = struct.pack(
        ">4d2i",
        grid.south,
        grid.west,
        grid.latitude_step,
        grid.longitude_step,
        *grid.values.shape,
    )
    values = np.where(np.isnan(grid.values), -88.8888, grid.values).astype(">f4")
    path.write_bytes(header + values.tobytes())
    return path


def write_isg(path: Path, grid: Grid, *, sexagesimal: bool = True, cells: bool = True) -> Path:
    """Limits of the cells or of the nodes, as degrees, minutes and seconds or as decimals."""
    half = 0.5 if cells else 0.0
    limits = {
        "lat min": grid.south - half * grid.latitude_step,
        "lat max": grid.north + half * grid.latitude_step,
        "lon min": grid.west - half * grid.longitude_step,
        "lon max": grid.east + half * grid.longitude_step,
        "delta lat": grid.latitude_step,
        "delta lon": grid.longitude_step,
    }
    shown = {key: dms(v) if sexagesimal else f"{v:.6f}" for key, v in limits.items()}
    rows, columns = grid.values.shape
    head = [
        "model name     : invented",
        "model type     : gravimetric",
        "data type      : quasi-geoid",
        "data units     : meters",
        "data format    : grid",
        "data ordering  : N-to-S, W-to-E",
        "ref ellipsoid  : GRS80",
        "ref frame      : ---",
        "height datum   : ---",
        "tide system    : zero-tide",
        "coord type     : geodetic",
        f"coord units    : {'dms' if sexagesimal else 'deg'}",
        *(f"{key} = {value}" for key, value in shown.items()),
        f"nrows = {rows}",
        f"ncols = {columns}",
        "nodata = -9999.0000",
        "ISG format = 2.0",
    ]
    body = [
        " ".join("-9999.0000" if np.isnan(v) else f"{v:.8f}" for v in row)
        for row in grid.values[::-1]
    ]
    lines = ["an invented model", "begin_of_head ====", *head, "end_of_head ====", *body]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def dms(angle: float) -> str:
    seconds = round(abs(angle) * 3600)
    sign = "-" if angle < 0.0 else ""
    return f"{sign}{seconds // 3600}°{seconds // 60 % 60:02d}'{seconds % 60:02d}\""


def write_geotiff(path: Path, *grids: Grid, tags: dict[str, str] | None = None) -> Path:
    """A GeoTIFF geodetic grid of points; further grids are nested images."""
    import rasterio
    from rasterio import Affine

    for number, grid in enumerate(grids):
        rows, columns = grid.values.shape
        transform = Affine(
            grid.longitude_step,
            0.0,
            grid.west - grid.longitude_step / 2.0,
            0.0,
            -grid.latitude_step,
            grid.north + grid.latitude_step / 2.0,
        )
        nested = {"APPEND_SUBDATASET": "YES"} if number else {}
        with rasterio.open(
            path,
            "w",
            driver="GTiff",
            width=columns,
            height=rows,
            count=1,
            dtype="float32",
            crs="EPSG:4258",
            transform=transform,
            nodata=-32768.0,
            **nested,
        ) as image:
            values = np.where(np.isnan(grid.values), -32768.0, grid.values)
            image.write(np.float32(values[::-1]), 1)
            image.set_band_description(1, "geoid_undulation")
            image.units = ("metre",)
            own = {"grid_name": f"g{number}", **({"parent_grid_name": "g0"} if number else {})}
            usual = {"AREA_OR_POINT": "Point", "TYPE": "VERTICAL_OFFSET_GEOGRAPHIC_TO_VERTICAL"}
            image.update_tags(**(usual | own | (tags or {})))
    return path


def write_ggxf(
    path: Path,
    grid: Grid,
    *nested: Grid,
    latitude_along_i: bool = True,
    downward: bool = True,
    edit: Callable[[Any], None] | None = None,
) -> Path:
    """A GGXF file with nested grids; `edit` changes the open dataset at the end."""
    import netCDF4
    from pyproj import CRS

    with netCDF4.Dataset(path, "w") as out:
        out.Conventions = "GGXF-1.0, ACDD-1.3"
        out.content = "geoidModel"
        out.interpolationCrsWkt = CRS.from_epsg(4258).to_wkt()
        for key, value in {
            "parameters.count": np.int32(1),
            "parameters.0.parameterName": "heightAnomaly",
            "parameters.0.unitSiRatio": 1.0,
            **{f"clockgeo_{name}": text for name, text in CONVENTIONS.items()},
        }.items():
            out.setncattr(key, value)
        group = out.createGroup("all")
        group.interpolationMethod = "bilinear"
        for number, one in enumerate((grid, *nested)):
            group = group.createGroup(f"g{number}")
            _fill_ggxf(group, one, latitude_along_i, downward)
        if edit is not None:
            edit(out)
    return path


def _fill_ggxf(group: Any, grid: Grid, latitude_along_i: bool, downward: bool) -> None:
    values = grid.values[::-1] if downward else grid.values
    first = grid.north if downward else grid.south
    step = -grid.latitude_step if downward else grid.latitude_step
    if latitude_along_i:
        coefficients = [first, step, 0.0, grid.west, 0.0, grid.longitude_step]
    else:
        values = values.T
        coefficients = [first, 0.0, step, grid.west, grid.longitude_step, 0.0]
    group.createDimension("iNodeCount", values.shape[0])
    group.createDimension("jNodeCount", values.shape[1])
    variable = group.createVariable(
        "heightAnomaly", "f4", ("iNodeCount", "jNodeCount"), fill_value=np.nan
    )
    variable[:] = values
    group.affineCoeffs = np.array(coefficients)


def finer_part(grid: Grid, lift: float) -> Grid:
    """The middle of a grid at half its steps, lifted so that it can be told apart."""
    rows, columns = grid.values.shape
    shape = (2 * (rows - 3) + 1, 2 * (columns - 3) + 1)
    return replace(
        grid,
        south=grid.south + grid.latitude_step,
        west=grid.west + grid.longitude_step,
        latitude_step=grid.latitude_step / 2.0,
        longitude_step=grid.longitude_step / 2.0,
        values=np.full(shape, np.nanmean(grid.values) + lift, dtype=np.float32),
    )
