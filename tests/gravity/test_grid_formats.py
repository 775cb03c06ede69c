"""One invented grid through every format gives the same values, by another interpolation."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from scipy.interpolate import RegularGridInterpolator

from clockgeo.errors import DataError
from clockgeo.gravity import open_geoid
from grid_files import (
    CONVENTIONS,
    finer_part,
    invented_grid,
    small_grid,
    write_cf,
    write_geotiff,
    write_ggxf,
    write_gtx,
    write_isg,
)

FLOAT32 = 4e-6  # m: half a step of single precision near 64 m
POINTS = 10_000


def descending(dataset: xr.Dataset) -> xr.Dataset:
    return dataset.isel(lat=slice(None, None, -1), lon=slice(None, None, -1))


def turned(dataset: xr.Dataset) -> xr.Dataset:
    """Axes in the other order, with other names and longitudes that jump at 180."""
    lon = (dataset.lon + 180.0) % 360.0 - 180.0
    renamed = dataset.assign_coords(lon=("lon", lon.values, dataset.lon.attrs))
    return renamed.transpose("lon", "lat").rename(lat="north_angle", lon="east_angle")


def single_axes(dataset: xr.Dataset) -> xr.Dataset:
    axes = {n: (n, dataset[n].values.astype(np.float32), dataset[n].attrs) for n in ("lat", "lon")}
    return dataset.assign_coords(axes)


def in_centimetres(dataset: xr.Dataset) -> xr.Dataset:
    zeta = dataset.zeta.astype(np.float64) * 100.0
    return dataset.assign(zeta=zeta.assign_attrs(dataset.zeta.attrs | {"units": "cm"}))


def with_time(dataset: xr.Dataset) -> xr.Dataset:
    return dataset.expand_dims(time=[0.0])


def west_of_zero(grid):
    return type(grid)(
        grid.south, grid.west - 360.0, grid.latitude_step, grid.longitude_step, grid.values
    )


WRITERS = {
    "CF": lambda path, grid: write_cf(path, grid),
    "CF descending": lambda path, grid: write_cf(path, grid, edit=descending),
    "CF turned, jump at 180": lambda path, grid: write_cf(path, grid, edit=turned),
    "CF single precision axes": lambda path, grid: write_cf(path, grid, edit=single_axes),
    "CF in centimetres": lambda path, grid: write_cf(path, grid, edit=in_centimetres),
    "CF with a time of one": lambda path, grid: write_cf(path, grid, edit=with_time),
    "GGXF, i along latitude": lambda path, grid: write_ggxf(path, grid),
    "GGXF, i along longitude": lambda path, grid: write_ggxf(path, grid, latitude_along_i=False),
    "GGXF, upward": lambda path, grid: write_ggxf(path, grid, downward=False),
    "GeoTIFF": lambda path, grid: write_geotiff(path, grid),
    "GTX": lambda path, grid: write_gtx(path, grid),
    "GTX from -187": lambda path, grid: write_gtx(path, west_of_zero(grid)),
    "ISG, cells, sexagesimal": lambda path, grid: write_isg(path, grid),
    "ISG, nodes, decimal": lambda path, grid: write_isg(path, grid, sexagesimal=False, cells=False),
}


@pytest.fixture(scope="module")
def points():
    """Random points in and around the grid, and its values there by scipy."""
    grid = invented_grid()
    rng = np.random.default_rng(11)
    latitude = rng.uniform(grid.south - 0.5, grid.north + 0.5, POINTS)
    longitude = rng.uniform(grid.west - 0.5, grid.east + 0.5, POINTS)
    independent = RegularGridInterpolator(
        (grid.latitudes, grid.longitudes),
        grid.values.astype(np.float64),
        bounds_error=False,
        fill_value=np.nan,
    )
    wrapped = np.where(longitude > 180.0, longitude - 360.0, longitude)
    return latitude, wrapped, independent(np.stack([latitude, longitude], axis=-1))


@pytest.mark.parametrize("name", WRITERS)
def test_every_format_gives_the_same_values(name, tmp_path, points):
    path = WRITERS[name](tmp_path / "model", invented_grid())
    model = open_geoid(path, **CONVENTIONS)
    latitude, longitude, expected = points
    values = model.sample(latitude, longitude, outside="nan")
    assert np.array_equal(np.isnan(values), np.isnan(expected))
    assert 0.5 < np.mean(np.isfinite(values)) < 0.95
    assert np.nanmax(np.abs(values - expected)) < FLOAT32
    east = model.sample(latitude, np.mod(longitude, 360.0), outside="nan")
    assert np.allclose(values, east, rtol=0.0, atol=1e-9, equal_nan=True)


@pytest.mark.parametrize("name", WRITERS)
def test_points_without_a_value_are_errors(name, tmp_path):
    path = WRITERS[name](tmp_path / "model", invented_grid())
    model = open_geoid(path, **CONVENTIONS)
    with pytest.raises(DataError, match=r"lies outside the grid .*latitude -9\.0.*\(at model\)"):
        model.sample(-9.0, 180.0)
    with pytest.raises(DataError, match=r"has no data in the grid \(1 of 2 points"):
        model.sample([-12.0, -20.0], [180.0, 173.0])
    # a node on the edge of the data needs none of its neighbours
    grid = invented_grid()
    assert model.sample(grid.latitudes[6], grid.longitudes[8]) == pytest.approx(
        grid.values[6, 8], abs=FLOAT32
    )


@pytest.mark.parametrize("name", ["GeoTIFF", "GGXF"])
def test_the_finest_of_nested_grids_wins(name, tmp_path):
    coarse = small_grid()
    fine = finer_part(coarse, lift=5.0)
    write = {"GeoTIFF": write_geotiff, "GGXF": write_ggxf}[name]
    model = open_geoid(write(tmp_path / "nest", coarse, fine), **CONVENTIONS)
    inside = model.sample(fine.latitudes[1], fine.longitudes[1])
    assert inside == pytest.approx(float(fine.values[1, 1]), abs=FLOAT32)
    corner = model.sample(coarse.south, coarse.west)
    assert corner == pytest.approx(float(coarse.values[0, 0]), abs=FLOAT32)
    mixed = model.sample([fine.latitudes[1], coarse.south], [fine.longitudes[1], coarse.west])
    assert np.array_equal(mixed, [inside, corner])


def test_xarray_opens_the_formats_itself(tmp_path):
    grid = invented_grid()
    files = {
        "gtx": write_gtx(tmp_path / "a.gtx", grid),
        "isg": write_isg(tmp_path / "a.isg", grid),
        "ggxf": write_ggxf(tmp_path / "a.ggxf", grid),
    }
    for engine, path in files.items():
        # xarray takes GGXF for plain netCDF unless told otherwise
        for options in ({"engine": engine}, *([{}] if engine != "ggxf" else [])):
            with xr.open_dataset(path, **options) as dataset:
                name = "zero_surface_height" if engine == "gtx" else "height_anomaly"
                assert np.allclose(dataset[name], grid.values, atol=FLOAT32, equal_nan=True)
                assert dataset[name].attrs["units"] == "m"
                assert np.allclose(dataset.latitude, grid.latitudes, atol=1e-12)
        if engine != "gtx":
            assert dataset[name].attrs["tide_system"] == "zero_tide"


def test_xarray_opens_one_of_several_grids_by_name(tmp_path):
    coarse = small_grid()
    path = write_ggxf(tmp_path / "nest.ggxf", coarse, finer_part(coarse, lift=5.0))
    with xr.open_dataset(path, engine="ggxf", grid="g0") as dataset:
        assert dataset.sizes == {"latitude": 4, "longitude": 5}
    with pytest.raises(DataError, match=r"no single grid to open .*grid = one of g1, g0"):
        xr.open_dataset(path, engine="ggxf")
    with pytest.raises(DataError, match=r"no such grid: g7"):
        xr.open_dataset(path, engine="ggxf", grid="g7")
    with xr.open_dataset(path, engine="ggxf", grid="g0", drop_variables="crs") as dataset:
        assert "crs" not in dataset
