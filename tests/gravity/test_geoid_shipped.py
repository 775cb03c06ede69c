"""The shipped grids: checksums, conventions, and EGM96 and national grids against pyproj."""

from __future__ import annotations

import importlib.util
import struct
import sys
import tomllib

import numpy as np
import pytest
from pyproj import Transformer

from checks import assert_close
from clockgeo.files import sha256_of, shipped_grid
from clockgeo.gravity import (
    TideSystem,
    missing_conventions,
    open_geoid,
    read_grid,
    write_geoid,
    zero_level,
)

POINTS = 100_000
STATED = {"tide_system": "zero_tide", "zero_level": "height_reference", "quantity": "geoid_height"}


@pytest.fixture(scope="module")
def manifest(project):
    return tomllib.loads((project / "grids" / "manifest.toml").read_text(encoding="utf-8"))


def by_pyproj(path, latitude, longitude, step="vgridshift +multiplier=1"):
    """Heights that another library interpolates in the same file."""
    pipeline = Transformer.from_pipeline(
        "+proj=pipeline +step +proj=unitconvert +xy_in=deg +xy_out=rad "
        f"+step +proj={step} +grids={path}"
    )
    lon = (np.asarray(longitude) + 180.0) % 360.0 - 180.0
    return pipeline.transform(lon, latitude, np.zeros(np.shape(latitude)))[2]


def test_every_grid_is_the_one_in_the_manifest(manifest, project):
    files = {entry["file"] for entry in manifest.values()}
    assert files == {path.name for path in (project / "grids").glob("*.nc")}
    for entry in manifest.values():
        assert sha256_of(shipped_grid(entry["file"])) == entry["sha256"], entry["file"]


def test_the_readme_of_the_grids_names_them_and_their_attributes(manifest, project):
    text = (project / "grids" / "README.md").read_text(encoding="utf-8")
    for entry in manifest.values():
        assert f"`{entry['file']}`" in text
        for name in read_grid(shipped_grid(entry["file"])).stated:
            assert name == "source" or f"`{name}`" in text


def test_egm96_against_another_library_on_the_same_data(tmp_path, rng):
    """GTX written by the project, interpolated by pyproj: at most 0.1 mm apart."""
    model = open_geoid(shipped_grid("egm96_15.nc"))
    write_geoid(model, tmp_path / "egm96.gtx")
    latitude = np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, POINTS)))
    longitude = rng.uniform(-180.0, 360.0, POINTS)
    expected = by_pyproj(tmp_path / "egm96.gtx", latitude, longitude)
    assert np.all(np.isfinite(expected))
    assert np.max(np.abs(model.sample(latitude, longitude) - expected)) < 1e-4


def test_egm96_is_the_source_to_half_a_step(real_grids, manifest):
    """Node by node against the GTX file, read here by hand."""
    path = real_grids / manifest["egm96_15"]["source"]
    assert sha256_of(path) == manifest["egm96_15"]["source_sha256"]
    content = path.read_bytes()
    south, west, *steps, rows, columns = struct.unpack_from(">4d2i", content)
    source = np.frombuffer(content, ">f4", offset=40).reshape(rows, columns)
    tile = open_geoid(shipped_grid("egm96_15.nc")).tiles[0]
    lattice = (tile.south, tile.west, tile.latitude_step, tile.longitude_step)
    assert lattice == (south, west, *steps)
    assert np.max(np.abs(tile.values - source)) <= 0.5e-4 * (1.0 + 1e-9)


def test_what_is_stated_of_egm96():
    model = open_geoid(shipped_grid("egm96_15.nc"))
    assert (model.quantity, model.ellipsoid) == ("geoid_height", "wgs84")
    assert model.tide_system is TideSystem.TIDE_FREE
    # the zero-degree term of -0.53 m (from memory) that the values contain, times gravity
    above = model.zero_level.w0 - zero_level("wgs84").w0
    assert above / 9.798 == pytest.approx(0.53, abs=0.005)


# Test values of the 15' EGM96 grid as distributed with it (degrees, degrees, m): from memory. They
# come from a spline; on this grid two smooth interpolations differ by up to about a centimetre.
EGM96_VALUES = [
    (38.6281550, 269.7791550, -31.628),
    (-14.6212170, 305.0211140, -2.969),
    (46.8743190, 102.4487290, -43.575),
    (-23.6174460, 133.8747120, 15.871),
    (38.6254730, 359.9995000, 50.066),
    (-0.4667440, 0.0023000, 17.329),
]


@pytest.mark.parametrize(("latitude", "longitude", "published"), EGM96_VALUES)
def test_egm96_at_published_places(latitude, longitude, published):
    model = open_geoid(shipped_grid("egm96_15.nc"))
    value = model.sample(latitude, longitude, interpolation="bicubic")
    assert_close(value, published, tolerance=0.012)
    estimate = model.interpolation_error(latitude, longitude)
    assert abs(model.sample(latitude, longitude) - published) < 2.0 * estimate + 0.01


def test_the_invented_grid_can_be_made_again(project):
    spec = importlib.util.spec_from_file_location(
        "invented_geoid", project / "examples" / "invented_geoid.py"
    )
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    try:
        spec.loader.exec_module(module)
    finally:
        del sys.modules[spec.name]
    made = module.invented_model(module.REGIONS["saddle"])
    shipped = open_geoid(shipped_grid("saddle_quasigeoid.nc"))
    assert shipped.conventions == made.conventions
    values = shipped.tiles[0].values
    assert np.max(np.abs(values - made.tiles[0].values)) <= 0.5e-4 * (1.0 + 1e-9)
    assert values.min() > 45.0
    assert values.max() < 50.0


FRANCE, SWITZERLAND = "fr_ign_RAF20.tif", "ch_swisstopo_chgeo2004_ETRS89_LHN95.tif"


@pytest.mark.parametrize(
    ("name", "method"),
    [
        (FRANCE, "bilinear"),
        (FRANCE, "biquadratic"),
        (SWITZERLAND, "bilinear"),
        (SWITZERLAND, "biquadratic"),
        ("egm96_15.gtx", "bilinear"),
    ],
)
def test_real_grids_against_another_library(name, method, real_grids, rng):
    ellipsoid = "wgs84" if name.endswith(".gtx") else "grs80"
    model = open_geoid(real_grids / name, interpolation=method, ellipsoid=ellipsoid, **STATED)
    tile = model.tiles[0]
    latitude = rng.uniform(tile.south, tile.north, POINTS)
    longitude = rng.uniform(tile.west, tile.west + tile.width, POINTS)
    step = {
        "bilinear": "vgridshift +multiplier=1",
        "biquadratic": "gridshift +interpolation=biquadratic",
    }[method]
    expected = by_pyproj(real_grids / name, latitude, longitude, step)
    assert np.all(np.isfinite(expected))
    assert np.max(np.abs(model.sample(latitude, longitude) - expected)) < 1e-9


def test_what_a_national_grid_does_not_say(real_grids):
    for name in (FRANCE, SWITZERLAND):
        content = read_grid(real_grids / name)
        assert content.stated["ellipsoid"] == "grs80"
        assert list(missing_conventions(content)) == ["quantity", "tide_system", "zero_level"]
