"""Legal variants of the formats: names only, packing, parameter sets, fields of u, rates, areas."""

from __future__ import annotations

import numpy as np
import pytest
import rasterio
import xarray as xr

from clockgeo.gravity import missing_conventions, open_geoid, read_grid
from clockgeo.gravity.grid_ggxf import YEAR
from grid_files import CONVENTIONS, small_grid, write_cf, write_geotiff, write_ggxf

PLACE = 46.25, 10.375
VALUE = 40.65  # of the plane of small_grid there: 40 + 0.25 / 0.5 + 0.1 * 0.375 / 0.25


def bare_axes(dataset, **names):
    """COARDS at its barest: axes that state nothing but their names."""
    renamed = dataset.rename(names)
    for name in renamed.coords:
        renamed[name].attrs = {}
    return renamed


CF_VARIANTS = {
    "lat, lon": lambda d: bare_axes(d),
    "Latitude, Longitude": lambda d: bare_axes(d, lat="Latitude", lon="Longitude"),
    "y, x": lambda d: bare_axes(d, lat="y", lon="x"),
    "units degree_N": lambda d: d.assign_coords(
        lat=("lat", d.lat.values, {"units": "degree_N"}),
        lon=("lon", d.lon.values, {"units": "degree_E"}),
    ),
    "standard names on odd names": lambda d: d.rename(lat="b", lon="l").assign_coords(
        b=("b", d.lat.values, {"standard_name": "latitude", "units": "degrees"}),
        l=("l", d.lon.values, {"standard_name": "longitude", "units": "degrees"}),
    ),
    "an axis attribute on one of them": lambda d: d.assign_coords(
        lat=("lat", d.lat.values, {"units": "degrees_north", "axis": "Y"})
    ),
}


@pytest.mark.parametrize("name", CF_VARIANTS)
def test_axes_by_any_name(name, tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=CF_VARIANTS[name])
    assert open_geoid(path).sample(*PLACE) == pytest.approx(VALUE, abs=4e-6)


def test_packed_integers_with_a_missing_value(tmp_path):
    def edit(dataset):
        values = dataset.zeta.where(dataset.zeta < 43.05)  # the north-east corner is missing
        encoding = {"dtype": "int16", "scale_factor": 0.01, "add_offset": 40.0}
        values.encoding = {**encoding, "_FillValue": np.int16(-32768)}
        return dataset.assign(zeta=values.assign_attrs(dataset.zeta.attrs))

    model = open_geoid(write_cf(tmp_path / "land.nc", small_grid(), edit=edit))
    assert model.sample(*PLACE) == pytest.approx(VALUE, abs=1e-9)
    assert np.isnan(model.sample(47.5, 11.0, outside="nan"))


def test_two_markers_of_missing_data_are_both_masked(tmp_path):
    import netCDF4

    path = write_cf(tmp_path / "land.nc", small_grid())
    with netCDF4.Dataset(path, "a") as out:
        out["zeta"].set_auto_mask(False)
        out["zeta"].missing_value = np.float32(9999.0)
        out["zeta"][3, 4] = 9999.0
    assert np.isnan(open_geoid(path).sample(47.5, 11.0, outside="nan"))


def test_a_field_of_u_by_its_standard_name(tmp_path):
    def edit(dataset):
        dataset.zeta.attrs["ancillary_variables"] = "status spread"
        words = {"standard_name": "height_anomaly standard_error", "units": "cm"}
        spread = xr.full_like(dataset.zeta, 3.0).assign_attrs(quantity="standard_uncertainty")
        return dataset.assign(spread=spread.assign_attrs(words))

    model = open_geoid(write_cf(tmp_path / "land.nc", small_grid(), edit=edit))
    assert model.u(*PLACE) == pytest.approx(0.03)
    assert model.errors.u == pytest.approx(0.03)
    stated = open_geoid(tmp_path / "land.nc", u=0.05)
    assert stated.u(*PLACE) == 0.05


def test_global_attributes_in_other_words_count(tmp_path):
    def edit(dataset):
        for name in CONVENTIONS:
            del dataset.zeta.attrs[name]
        dataset.zeta.attrs["standard_name"] = "geoid_height_above_reference_ellipsoid"
        return dataset.assign_attrs(tide_system="Tide-free", ellipsoid="GRS 1980", title="a model")

    content = read_grid(write_cf(tmp_path / "land.nc", small_grid(), edit=edit))
    assert list(missing_conventions(content)) == ["zero_level"]
    assert content.stated["tide_system"] == "tide_free"
    assert content.stated["source"] == "a model"


def as_set(second="heightAnomalyUncertainty", ratio=1.0, dims=("jNodeCount", "iNodeCount", "n")):
    """Two parameters in one variable with a third dimension, here with j before i."""

    def edit(out):
        out.setncattr("parameters.count", np.int32(2))
        out.setncattr("parameters.1.parameterName", second)
        out.setncattr("parameters.1.unitSiRatio", ratio)
        for number in (0, 1):
            out.setncattr(f"parameters.{number}.parameterSet", "model")
        grid = out.groups["all"].groups["g0"]
        grid.createDimension("n", 2)
        values = grid.variables["heightAnomaly"][:]
        both = {"iNodeCount": 0, "jNodeCount": 1, "n": 2}
        stacked = np.stack([values, np.full(values.shape, 0.02)], axis=-1)
        variable = grid.createVariable("model", "f8", dims)
        variable[:] = stacked.transpose([both[d] for d in dims])

    return edit


@pytest.mark.parametrize("latitude_along_i", [True, False])
@pytest.mark.parametrize(
    "dims", [("iNodeCount", "jNodeCount", "n"), ("jNodeCount", "iNodeCount", "n")]
)
def test_ggxf_parameter_sets(dims, latitude_along_i, tmp_path):
    path = write_ggxf(
        tmp_path / "a", small_grid(), latitude_along_i=latitude_along_i, edit=as_set(dims=dims)
    )
    model = open_geoid(path)
    assert model.sample(*PLACE) == pytest.approx(VALUE, abs=4e-6)
    assert model.u(*PLACE) == pytest.approx(0.02)


def test_a_ggxf_rate_in_millimetres_a_year(tmp_path):
    edit = as_set("geoidVelocity", ratio=1e-3 / YEAR)

    def with_epoch(out):
        edit(out)
        out.clockgeo_epoch = 2020.0

    model = open_geoid(write_ggxf(tmp_path / "a", small_grid(), edit=with_epoch))
    assert model.sample(*PLACE, epoch=2030.0) == pytest.approx(VALUE + 0.2e-3, abs=4e-6)


def test_ggxf_priority_decides_between_grids_of_one_depth(tmp_path):
    grid = small_grid()
    higher = type(grid)(46.0, 10.0, 0.5, 0.25, grid.values + np.float32(1.0))

    def edit(out):
        first = out.groups["all"].groups["g0"]
        second = out.groups["all"].createGroup("preferred")
        for name, dimension in first.dimensions.items():
            second.createDimension(name, dimension.size)
        copy = second.createVariable("heightAnomaly", "f4", ("iNodeCount", "jNodeCount"))
        copy[:] = higher.values[::-1]
        second.affineCoeffs = first.affineCoeffs
        second.gridPriority = np.int32(2)

    model = open_geoid(write_ggxf(tmp_path / "a", grid, edit=edit))
    assert model.sample(*PLACE) == pytest.approx(VALUE + 1.0, abs=4e-6)


def test_a_geotiff_of_scaled_integers_with_a_band_of_u(tmp_path):
    path = write_geotiff(tmp_path / "plain.tif", small_grid())
    with rasterio.open(path) as image:
        profile, values = image.profile, image.read(1)
    profile |= {"dtype": "int16", "nodata": -1, "count": 2}
    with rasterio.open(tmp_path / "scaled.tif", "w", **profile) as image:
        stored = np.int16(np.round((values - 40.0) / 0.001))
        stored[0, -1] = -1  # the north-east corner
        image.write(stored, 1)
        image.write(np.full(values.shape, 30, dtype=np.int16), 2)
        image.scales, image.offsets = (0.001, 0.001), (40.0, 0.0)
        image.set_band_description(1, "geoid_undulation")
        image.set_band_description(2, "geoid_undulation_uncertainty")
        image.units = ("metre", "metre")
    model = open_geoid(tmp_path / "scaled.tif", **CONVENTIONS)
    assert model.sample(*PLACE) == pytest.approx(VALUE, abs=1e-6)
    assert model.u(*PLACE) == pytest.approx(0.03)
    assert np.isnan(model.sample(47.5, 11.0, outside="nan"))


@pytest.mark.parametrize("kind", ["Point", "Area"])
def test_a_geotiff_value_lies_at_the_centre_of_its_pixel(kind, tmp_path):
    """GeoTIFF 1.1, section 7.1.1: areas and points differ by half a pixel, which GDAL settles."""
    path = write_geotiff(tmp_path / "a.tif", small_grid(), tags={"AREA_OR_POINT": kind})
    assert open_geoid(path, **CONVENTIONS).sample(*PLACE) == pytest.approx(VALUE, abs=4e-6)


def test_a_geotiff_may_recommend_an_interpolation(tmp_path):
    tags = {"recommended_interpolation_method": "biquadratic"}
    path = write_geotiff(tmp_path / "a.tif", small_grid(), tags=tags)
    assert open_geoid(path, **CONVENTIONS).interpolation == "biquadratic"
