"""Damaged copies of good grids: each is refused by file and field."""

from __future__ import annotations

import sys

import numpy as np
import pytest
import xarray as xr

from clockgeo.errors import ClockgeoError, ConventionError, DataError
from clockgeo.gravity import open_geoid
from grid_files import (
    CONVENTIONS,
    invented_grid,
    small_grid,
    write_cf,
    write_geotiff,
    write_ggxf,
    write_gtx,
    write_isg,
)


def rewritten(path, old, new):
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new), encoding="utf-8")
    return path


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.99])
@pytest.mark.parametrize("write", [write_cf, write_ggxf, write_geotiff, write_gtx, write_isg])
def test_truncated_files(write, share, tmp_path):
    path = write(tmp_path / "cut", invented_grid())
    content = path.read_bytes()
    path.write_bytes(content[: int(len(content) * share)])
    with pytest.raises(DataError, match=r"\(at cut|, where|cut\)"):
        open_geoid(path, **CONVENTIONS)


@pytest.fixture(scope="module")
def classic(tmp_path_factory):
    """A good grid in classic netCDF, which libraries fill up with zeros when it is cut."""
    folder = tmp_path_factory.mktemp("classic")
    with xr.open_dataset(write_cf(folder / "whole.nc", invented_grid())) as dataset:
        dataset.to_netcdf(folder / "classic.nc", engine="netcdf4", format="NETCDF3_64BIT")
    assert open_geoid(folder / "classic.nc").sample(-15.0, 175.0) == pytest.approx(
        open_geoid(folder / "whole.nc").sample(-15.0, 175.0)
    )
    return folder / "classic.nc"


@pytest.mark.parametrize("missing", [1, 8, 600, 5000, 9990, 11000])
def test_a_truncated_classic_netcdf(classic, missing, tmp_path):
    content = classic.read_bytes()
    (tmp_path / "cut.nc").write_bytes(content[:-missing])
    with pytest.raises(
        DataError, match=r"netCDF file cannot be read.*cut\.nc.*compare its checksum"
    ):
        open_geoid(tmp_path / "cut.nc")


def test_a_variant_whose_truncation_would_go_unseen_is_refused(tmp_path):
    (tmp_path / "five.nc").write_bytes(b"CDF\x05" + b"\x00" * 99)
    with pytest.raises(DataError, match=r"CDF-5 is not read.*five\.nc.*Convert it"):
        open_geoid(tmp_path / "five.nc")


CF_DAMAGE = {
    "swapped axes": (
        lambda d: d.rename(lat="lon", lon="lat").assign_coords(
            lat=("lat", d.lon.values, {"units": "degrees_north"}),
            lon=("lon", d.lat.values, {"units": "degrees_east"}),
        ),
        DataError,
        r"latitudes are out of range: 173 to 188.*axes are swapped",
    ),
    "no unit": (
        lambda d: d.assign(zeta=d.zeta.assign_attrs(units="")),
        ConventionError,
        r"grid states no unit \(at land\.nc, variable zeta, attribute units",
    ),
    "feet": (
        lambda d: d.assign(zeta=d.zeta.assign_attrs(units="ft")),
        ConventionError,
        r"not metric: ft \(at land\.nc, variable zeta, attribute units\)",
    ),
    "no axis": (
        lambda d: d.drop_vars("lat"),
        DataError,
        r"no single latitude axis in the grid: variables .*land\.nc",
    ),
    "axis in radians": (
        lambda d: d.assign_coords(
            lat=("lat", np.radians(d.lat.values), {"units": "rad", "standard_name": "latitude"})
        ),
        DataError,
        r"latitude axis is not in degrees: rad \(at land\.nc, variable lat, attribute units",
    ),
    "two variables": (
        lambda d: d.assign(other=d.zeta),
        DataError,
        r"no single variable .*: zeta, other.*Name the one",
    ),
    "no variable": (
        lambda d: d.isel(lat=0),
        DataError,
        r"no single ",
    ),
    "an irregular axis": (
        lambda d: d.isel(lat=[0, 1, 3, 4, 5]),
        DataError,
        r"latitudes are not evenly spaced.*land\.nc, variable zeta",
    ),
    "fill value not declared": (
        lambda d: d.fillna(-9999.0),
        DataError,
        r"too large for geoid heights in metres: 9999 .*value that stands for missing data",
    ),
}


@pytest.mark.parametrize("name", CF_DAMAGE)
def test_damaged_netcdf(name, tmp_path):
    edit, error, message = CF_DAMAGE[name]
    path = write_cf(tmp_path / "land.nc", invented_grid(), edit=edit)
    with pytest.raises(error, match=message):
        open_geoid(path, **CONVENTIONS)


def test_one_of_several_variables_can_be_named(tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=lambda d: d.assign(other=d.zeta + 1.0))
    first, second = (open_geoid(path, variable=v, **CONVENTIONS) for v in ("zeta", "other"))
    assert second.sample(46.0, 10.0) - first.sample(46.0, 10.0) == pytest.approx(1.0)
    with pytest.raises(DataError, match=r"no single variable .*: third"):
        open_geoid(path, variable="third")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("nrows = 4", "nrows = 5", r"\(nrows, ncols\): 20 values for 5 rows and 5 columns"),
        ("nrows = 4", "nrows = 4.5", r"count .* out of range: nrows = 4\.5 \(at land\.isg\)"),
        ("nrows = 4\n", "", r"field is missing in the ISG header: nrows \(at land\.isg\)"),
        ("ncols = 5", "ncols = many", r"no number: ncols = 'many' \(at land\.isg\)"),
        ("delta lat = 0°30'00\"", "delta lat = 0°20'00\"", r"do not fit \(lat min, lat max, delta"),
        ("delta lon = 0°15'00\"", "delta lon = 0°00'00\"", r"do not fit \(lon min, lon max, delta"),
        ("lat max = 47°45'00\"", "lat max = 97°45'00\"", r"do not fit \(lat min, lat max"),
        ("geodetic", "projected", r"not supported: coord type = 'projected' \(at land\.isg\)"),
        ("format    : grid", "format    : sparse", r"not supported: data format = 'sparse'"),
        ("meters", "feet", r"not metric: feet \(at land\.isg, field data units\)"),
        ("data units     : meters\n", "", r"grid states no unit \(at land\.isg, field data units"),
        ("N-to-S, W-to-E", "E-to-W", r"not supported: data ordering = 'E-to-W'"),
        ("40.00000000", "40.00x", r"value of the ISG grid is no number.*40\.00x"),
        ("end_of_head", "end", r"no header in the ISG file"),
        ("zero-tide", "half-tide", r"unknown tide system|field tide_system"),
    ],
)
def test_damaged_isg(old, new, message, tmp_path):
    path = rewritten(write_isg(tmp_path / "land.isg", small_grid()), old, new)
    with pytest.raises(ClockgeoError, match=message):
        open_geoid(path, **CONVENTIONS)


@pytest.mark.parametrize("angle", ["46°00'00\"", "46 deg 00'00\"", "46.0", "46°", "46° 00' 00.0\""])
def test_angles_in_every_spelling(angle, tmp_path):
    path = write_isg(tmp_path / "land.isg", small_grid(), cells=False)
    rewritten(path, "lat min = 46°00'00\"", f"lat min = {angle}")
    assert open_geoid(path, **CONVENTIONS).sample(46.0, 10.0) == pytest.approx(40.0, abs=1e-7)


def test_an_isg_grid_may_run_from_south_to_north(tmp_path):
    grid = small_grid()
    path = write_isg(tmp_path / "land.isg", type(grid)(46.0, 10.0, 0.5, 0.25, grid.values[::-1]))
    rewritten(path, "N-to-S", "S-to-N")
    assert open_geoid(path, **CONVENTIONS).sample(46.5, 10.0) == pytest.approx(41.0, abs=1e-7)


def affine(*coefficients):
    def edit(out):
        out.groups["all"].groups["g0"].affineCoeffs = np.array(coefficients)

    return edit


def attribute(name, value):
    return lambda out: out.setncattr(name, value)


PROJECTED = 'PROJCRS["x",BASEGEOGCRS["y",DATUM["z",ELLIPSOID["GRS 1980",6378137,298.257222101]]],'
GGXF_DAMAGE = {
    "five coefficients": (affine(46, 0.5, 0, 10, 0), r"six affine coefficients: 5 .*g0, affineCo"),
    "rotated": (
        affine(46, 0.5, 0.1, 10, 0.1, 0.25),
        r"not aligned .*: 46, 0\.5, 0\.1.*affineCoeffs",
    ),
    "no parameter": (
        attribute("parameters.0.parameterName", "eastOffset"),
        r"no single geoid height .*: eastOffset \(at land\.ggxf, parameters\)",
    ),
    "no CRS": (
        attribute("interpolationCrsWkt", ""),
        r"cannot be read: missing .*interpolationCrsW",
    ),
    "bad CRS": (attribute("interpolationCrsWkt", "GEOGCRS[x"), r"cannot be read: 'GEOGCRS\[x'"),
    "vertical CRS": (
        attribute(
            "interpolationCrsWkt",
            'VERTCRS["v",VDATUM["d"],CS[vertical,1],AXIS["H",up],LENGTHUNIT["metre",1]]',
        ),
        r"not in geographic coordinates: v .*interpolationCrsWkt",
    ),
}


@pytest.mark.parametrize("name", GGXF_DAMAGE)
def test_damaged_ggxf(name, tmp_path):
    edit, message = GGXF_DAMAGE[name]
    path = write_ggxf(tmp_path / "land.ggxf", small_grid(), edit=edit)
    with pytest.raises(DataError, match=message):
        open_geoid(path)


def test_ggxf_axes_follow_the_interpolation_crs(tmp_path):
    """With longitude as the first axis of the CRS the first three coefficients are its."""
    from pyproj import CRS

    lon_first = CRS("OGC:CRS84").to_wkt()

    def edit(out):
        out.interpolationCrsWkt = lon_first
        out.setncattr("clockgeo_ellipsoid", "wgs84")
        grid = out.groups["all"].groups["g0"]
        grid.affineCoeffs = np.roll(grid.affineCoeffs, 3)

    path = write_ggxf(tmp_path / "land.ggxf", small_grid(), edit=edit)
    assert open_geoid(path).sample(46.5, 10.25) == pytest.approx(41.1, abs=4e-6)


def test_ggxf_units_come_from_the_si_ratio(tmp_path):
    path = write_ggxf(
        tmp_path / "land.ggxf", small_grid(), edit=attribute("parameters.0.unitSiRatio", 0.5)
    )
    assert open_geoid(path).sample(46.0, 10.0) == pytest.approx(20.0)


def test_a_geotiff_of_another_kind(tmp_path):
    path = write_geotiff(tmp_path / "land.tif", small_grid(), tags={"TYPE": "HORIZONTAL_OFFSET"})
    with pytest.raises(DataError, match=r"not a geoid model: HORIZONTAL_OFFSET .*image 1, TYPE"):
        open_geoid(path, **CONVENTIONS)


def test_without_rasterio_the_extra_is_named(tmp_path, monkeypatch):
    path = write_geotiff(tmp_path / "land.tif", small_grid())
    monkeypatch.setitem(sys.modules, "rasterio", None)
    with pytest.raises(DataError, match=r"not installed \(at land\.tif\).*clockgeo\[geotiff\]"):
        open_geoid(path, **CONVENTIONS)
