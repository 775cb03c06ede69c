"""Writing and reading back: nothing is lost but what is said to be lost."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from clockgeo.errors import ConventionError, DataError, OutputError
from clockgeo.gravity import (
    ErrorModel,
    GeoidModel,
    GridTile,
    TideSystem,
    ZeroLevel,
    geoid_dataset,
    open_geoid,
    write_geoid,
    zero_level,
)
from clockgeo.gravity.grid_ggxf_writing import write_ggxf
from grid_files import CONVENTIONS

SHAPE = (5, 7)


def model(values=None, **options):
    values = 40.0 + np.arange(35.0).reshape(SHAPE) / 7.0 if values is None else values
    tile = GridTile(46.0, 175.0, 0.5, 2.0, values)
    given_ = {
        "name": "invented",
        "tiles": (tile,),
        "quantity": "height_anomaly",
        "tide_system": TideSystem.ZERO_TIDE,
        "zero_level": zero_level("height_reference"),
        "ellipsoid": "grs80",
        "source": "invented for a test",
    }
    return GeoidModel(**(given_ | options))


def with_fields():
    """A model with everything a file can hold."""
    plain = model(
        errors=ErrorModel(0.02, 60_000.0),
        epoch=2020.5,
        hybrid=True,
        fitted_to="old harbour",
        interpolation="bicubic",
        quantity="geoid_height",
        tide_system=TideSystem.MEAN_TIDE,
        zero_level=ZeroLevel("old harbour", 62_636_858.1),
        ellipsoid="wgs84",
    )
    tile = replace(
        plain.tiles[0], u=np.linspace(0.01, 0.05, 35).reshape(SHAPE), rate=np.full(SHAPE, 1.5e-3)
    )
    return replace(plain, tiles=(tile,))


def same_tiles(first, second, tolerance=0.0):
    for one, other in zip(first.tiles, second.tiles, strict=True):
        lattice = (one.south, one.west, one.latitude_step, one.longitude_step)
        assert lattice == pytest.approx(
            (other.south, other.west, other.latitude_step, other.longitude_step), abs=1e-12
        )
        for field in ("values", "u", "rate"):
            mine, theirs = getattr(one, field), getattr(other, field)
            assert (mine is None) == (theirs is None)
            if mine is not None:
                assert np.allclose(mine, theirs, rtol=0.0, atol=tolerance, equal_nan=True)


@pytest.mark.parametrize("ending", [".nc", ".ggxf"])
@pytest.mark.parametrize("make", [model, with_fields])
def test_round_trip(ending, make, tmp_path):
    before = make()
    write_geoid(before, tmp_path / f"a{ending}")
    after = open_geoid(tmp_path / f"a{ending}")
    assert after.conventions == before.conventions
    assert after.source == before.source
    assert after.zero_level.w0 == before.zero_level.w0
    same_tiles(before, after, tolerance=1e-15)


@settings(max_examples=40)
@given(
    values=arrays.arrays(
        np.float64,
        arrays.array_shapes(min_dims=2, max_dims=2, min_side=2, max_side=6),
        elements=st.floats(-110.0, 110.0) | st.just(np.nan),
    ).filter(lambda a: np.isfinite(a).any()),
    ending=st.sampled_from([".nc", ".ggxf", ".gtx"]),
    single=st.booleans(),
)
def test_any_values_come_back(values, ending, single, tmp_path_factory):
    path = tmp_path_factory.mktemp("any") / f"a{ending}"
    before = model(np.where(np.abs(values + 88.8888) < 1e-3, 0.0, values))
    if single:
        tile = before.tiles[0]
        before = replace(before, tiles=(replace(tile, values=np.float32(tile.values)),))
    write_geoid(before, path)
    after = open_geoid(path, **CONVENTIONS)
    same_tiles(before, after, tolerance=4e-6 if ending == ".gtx" else 0.0)
    if single:
        assert after.tiles[0].values.dtype == np.float32


def test_both_orientations_of_ggxf_are_the_same_grid(tmp_path):
    for index in ("latitude", "longitude"):
        write_ggxf(with_fields(), tmp_path / f"{index}.ggxf", first_index=index)
    first, second = (open_geoid(tmp_path / f"{i}.ggxf") for i in ("latitude", "longitude"))
    same_tiles(first, second)


def test_packed_values_are_half_a_step_off_at_most(tmp_path):
    rng = np.random.default_rng(3)
    values = rng.uniform(-107.0, 86.0, (200, 150))
    values[3, 4] = np.nan
    tile = GridTile(-30.0, -40.0, 0.25, 0.25, np.float32(values))
    before = replace(model(), tiles=(tile,))
    write_geoid(before, tmp_path / "a.nc", resolution=1e-4)
    after = open_geoid(tmp_path / "a.nc")
    worst = np.nanmax(np.abs(after.tiles[0].values - tile.values.astype(np.float64)))
    assert 0.49e-4 < worst <= 0.5e-4 * (1.0 + 1e-9)
    assert np.isnan(after.tiles[0].values[3, 4])
    with xr.open_dataset(tmp_path / "a.nc") as dataset:
        assert dataset.height_anomaly.attrs["comment"] == (
            "values are multiples of 0.0001 m, at most 5e-05 m off"
        )


@pytest.mark.parametrize("ending", [".nc", ".ggxf", ".gtx"])
def test_equal_models_give_equal_files(ending, tmp_path):
    paths = [tmp_path / f"{name}{ending}" for name in "ab"]
    for path in paths:
        write_geoid(with_fields(), path)
    if ending == ".gtx":
        assert paths[0].read_bytes() == paths[1].read_bytes()
        return
    # netCDF-4 also notes the time of writing: all that it holds must be the same.
    first, second = (
        xr.open_datatree(path, engine="netcdf4", decode_cf=False).load() for path in paths
    )
    assert first.identical(second)


def test_cf_attributes(tmp_path):
    write_geoid(with_fields(), tmp_path / "a.nc")
    with xr.open_dataset(tmp_path / "a.nc") as dataset:
        height = dataset["geoid_height"]
        assert height.attrs["standard_name"] == "geoid_height_above_reference_ellipsoid"
        assert height.attrs["units"] == "m"
        assert height.attrs["ancillary_variables"] == "geoid_height_u geoid_height_rate"
        assert dataset["geoid_height_u"].attrs["standard_name"].endswith(" standard_error")
        assert (height.encoding | height.attrs)["grid_mapping"] == "crs"
        assert dataset.crs.attrs["reference_ellipsoid_name"] == "WGS 84"
        assert dataset.crs.attrs["semi_major_axis"] == 6_378_137.0
        # NIMA TR8350.2: 1/f of WGS 84
        assert dataset.crs.attrs["inverse_flattening"] == pytest.approx(298.257223563, abs=1e-9)
        assert dataset.attrs["Conventions"].startswith("CF-")


def test_ggxf_states_conventions_in_the_target_crs_too(tmp_path):
    import netCDF4
    from pyproj import CRS

    write_geoid(model(), tmp_path / "a.ggxf")
    with netCDF4.Dataset(tmp_path / "a.ggxf") as out:
        target = CRS.from_wkt(out.targetCrsWkt)
        assert target.is_vertical
        assert target.remarks == "zero_tide, zero level height_reference"
        assert CRS.from_wkt(out.sourceCrsWkt).is_geographic
        assert out.content == "geoidModel"


def nest():
    """A coarse grid, a finer one in it, and a finest in that."""
    tiles = (
        GridTile(46.0, 10.0, 1.0, 1.0, np.full((5, 5), 40.0), name="all"),
        GridTile(47.0, 11.0, 0.5, 0.5, np.full((5, 5), 41.0), name="middle", depth=1),
        GridTile(47.5, 11.5, 0.25, 0.25, np.full((3, 3), 42.0), name="heart", depth=2, priority=1),
    )
    return replace(model(), tiles=tuple(sorted(tiles, key=lambda tile: tile.precedence)))


def test_a_nest_survives_in_ggxf(tmp_path):
    write_geoid(nest(), tmp_path / "a.ggxf")
    after = open_geoid(tmp_path / "a.ggxf")
    assert [(t.name, t.depth, t.priority) for t in after.tiles] == [
        ("heart", 2, 1),
        ("middle", 1, 0),
        ("all", 0, 0),
    ]
    values = after.sample([46.5, 47.2, 47.6], [10.5, 11.2, 11.6])
    assert values.tolist() == [40.0, 41.0, 42.0]
    lost = replace(after, tiles=after.tiles[:1])
    with pytest.raises(DataError, match="nested grid lies in no grid above it: heart"):
        write_geoid(lost, tmp_path / "b.ggxf")


@pytest.mark.parametrize("ending", [".nc", ".gtx"])
def test_a_nest_goes_into_no_format_of_one_grid(ending, tmp_path):
    with pytest.raises(DataError, match=r"does not fit into one .*3 grids.*Write it as GGXF"):
        write_geoid(nest(), tmp_path / f"a{ending}")
    with pytest.raises(DataError, match="does not fit into one CF netCDF grid"):
        geoid_dataset(nest())
    assert not list(tmp_path.iterdir())


def test_what_cannot_be_written(tmp_path):
    with pytest.raises(DataError, match=r"has this ending: a\.tif.*\.nc .*\.ggxf .*\.gtx"):
        write_geoid(model(), tmp_path / "a.tif")
    with pytest.raises(DataError, match=r"no such resolution: 0\.001 m for a\.gtx"):
        write_geoid(model(), tmp_path / "a.gtx", resolution=1e-3)
    with pytest.raises(DataError, match=r"no such resolution: 2\.0 m"):
        write_geoid(model(), tmp_path / "a.nc", resolution=2.0)
    with pytest.raises(ConventionError, match=r"no CRS is known for the ellipsoid .*: bessel 1841"):
        write_geoid(model(ellipsoid="bessel 1841"), tmp_path / "a.ggxf")
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("ending", [".nc", ".ggxf", ".gtx"])
def test_files_appear_whole_or_not_at_all(ending, tmp_path):
    path = tmp_path / f"a{ending}"
    path.write_text("precious")
    with pytest.raises(OutputError, match="exists already"):
        write_geoid(model(), path)
    assert path.read_text() == "precious"
    write_geoid(model(), path, replace=True)
    assert [p.name for p in tmp_path.iterdir()] == [path.name]
    with pytest.raises(OutputError, match="cannot write the output"):
        write_geoid(model(), tmp_path / "none" / f"a{ending}")


def test_an_ellipsoid_without_a_gravity_field_keeps_its_name(tmp_path):
    write_geoid(model(ellipsoid="bessel 1841"), tmp_path / "a.nc")
    assert open_geoid(tmp_path / "a.nc").ellipsoid == "bessel 1841"


GRS80_WKT = (
    'GEOGCRS["x",DATUM["y",ELLIPSOID["GRS 1980",6378137,298.257222101]],CS[ellipsoidal,2],'
    'AXIS["latitude",north],AXIS["longitude",east],ANGLEUNIT["degree",0.0174532925199433]]'
)


@pytest.mark.parametrize(
    ("mapping", "expected"),
    [
        ({"reference_ellipsoid_name": "WGS 1984"}, "wgs84"),
        ({"crs_wkt": GRS80_WKT}, "grs80"),
        ({"semi_major_axis": 6378137.0, "inverse_flattening": 298.257222101}, "grs80"),
        ({"semi_major_axis": 6378137.0, "inverse_flattening": 298.257223563}, "wgs84"),
    ],
)
def test_the_ellipsoid_of_a_grid_mapping(mapping, expected, tmp_path):
    dataset = geoid_dataset(model())
    del dataset["height_anomaly"].attrs["ellipsoid"]
    dataset["crs"].attrs = mapping
    dataset.to_netcdf(tmp_path / "a.nc", engine="netcdf4")
    assert open_geoid(tmp_path / "a.nc").ellipsoid == expected
    dataset["crs"].attrs = {"semi_major_axis": 6377397.155, "inverse_flattening": 299.15}
    dataset.to_netcdf(tmp_path / "b.nc", engine="netcdf4")
    with pytest.raises(ConventionError, match="does not state ellipsoid"):
        open_geoid(tmp_path / "b.nc")
