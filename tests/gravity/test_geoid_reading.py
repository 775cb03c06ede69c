"""`open_geoid`: formats by content, conventions never guessed, contradictions refused."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import (
    ErrorModel,
    TideSystem,
    ZeroLevel,
    missing_conventions,
    open_geoid,
    read_grid,
)
from grid_files import (
    CONVENTIONS,
    small_grid,
    write_cf,
    write_geotiff,
    write_ggxf,
    write_gtx,
    write_isg,
)


def without(*names):
    def edit(dataset):
        for name in names:
            del dataset.zeta.attrs[name]
        return dataset

    return edit


def stating(**attributes):
    def edit(dataset):
        dataset.zeta.attrs.update(attributes)
        return dataset

    return edit


@pytest.mark.parametrize("field", CONVENTIONS)
def test_a_missing_convention_names_file_and_field(field, tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=without(field))
    option = "--" + field.replace("_", "-")
    with pytest.raises(
        ConventionError, match=rf"does not state {field} \(at land\.nc\).*Needed: .*{option}"
    ):
        open_geoid(path)
    model = open_geoid(path, **{field: CONVENTIONS[field]})
    assert model.conventions == open_geoid(write_cf(tmp_path / "b.nc", small_grid())).conventions


def test_all_that_is_missing_is_told_at_once(tmp_path):
    path = write_gtx(tmp_path / "land.gtx", small_grid())
    with pytest.raises(
        ConventionError, match="does not state quantity, tide_system, zero_level, ellipsoid"
    ):
        open_geoid(path)
    assert list(missing_conventions(read_grid(path))) == list(CONVENTIONS)


@pytest.mark.parametrize(
    ("stated", "message"),
    [
        ({"quantity": "geoid_height"}, "field quantity.*stated geoid_height, in the file height_a"),
        (
            {"tide_system": "tide_free"},
            "field tide_system.*stated tide_free, in the file zero_tide",
        ),
        ({"zero_level": "time_scale"}, "field zero_level.*stated time_scale, in the file height_r"),
        ({"ellipsoid": "wgs84"}, "field ellipsoid.*stated wgs84, in the file grs80"),
        ({"tide_system": "half"}, "field tide_system.*stated half"),
        ({"zero_level": "sea"}, "unknown zero level: 'sea'"),
        ({"interpolation": "nearest"}, "unknown interpolation: 'nearest'"),
    ],
)
def test_what_the_file_says_may_not_be_contradicted(stated, message, tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid())
    with pytest.raises(ConventionError, match=message):
        open_geoid(path, **stated)


def test_the_same_convention_in_other_words_is_no_contradiction(tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid())
    model = open_geoid(
        path,
        quantity="quasi-geoid",
        tide_system=TideSystem.ZERO_TIDE,
        zero_level=62636853.4,
        ellipsoid="GRS 1980",
    )
    assert model.zero_level.name == "height_reference"


@pytest.mark.parametrize(
    ("attributes", "message"),
    [
        ({"tide_system": "moon-free"}, "unknown tide system: 'moon-free' .at land.nc, field tide"),
        ({"quantity": "depth"}, "does not state quantity"),
        ({"interpolation": "magic"}, "unknown interpolation: 'magic' .at land.nc, field interpol"),
        ({"zero_level_potential": "high"}, "zero level is no number: 'high'.*zero_level_potential"),
        ({"zero_level_potential": 9.8}, "not the potential of a zero level: 9.8"),
        ({"zero_level_potential": 62636856.0}, "name and potential .* contradict each other"),
    ],
)
def test_unknown_words_in_the_file(attributes, message, tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=stating(**attributes))
    with pytest.raises(ConventionError, match=message):
        open_geoid(path)


def test_u_and_epoch_that_are_no_numbers(tmp_path):
    for attributes, message in (
        ({"u": "small"}, r"field u of the grid is no number: 'small' \(at land.nc, field u\)"),
        ({"u": -0.1}, r"out of range: u -0.1.*land.nc, fields u and correlation_length"),
        ({"epoch": "recent"}, "field epoch of the grid is no number"),
    ):
        path = write_cf(tmp_path / "land.nc", small_grid(), edit=stating(**attributes))
        with pytest.raises(DataError, match=message):
            open_geoid(path)


def test_a_local_datum_keeps_its_own_name(tmp_path):
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=stating(zero_level="old harbour"))
    assert open_geoid(path).zero_level.w0 is None
    known = stating(zero_level="old harbour", zero_level_potential=62636858.1)
    level = open_geoid(write_cf(tmp_path / "b.nc", small_grid(), edit=known)).zero_level
    assert (level.name, level.w0) == ("old harbour", 62636858.1)
    own = ZeroLevel("new harbour", None)
    bare = write_cf(tmp_path / "c.nc", small_grid(), edit=without("zero_level"))
    assert open_geoid(bare, zero_level=own).zero_level is own


def test_the_users_u_and_interpolation_come_first(tmp_path):
    edit = stating(u=0.03, correlation_length=5e4, interpolation="bicubic", epoch=2020.5)
    path = write_cf(tmp_path / "land.nc", small_grid(), edit=edit)
    model = open_geoid(path)
    assert (model.errors, model.interpolation) == (ErrorModel(0.03, 5e4), "bicubic")
    assert model.epoch == 2020.5
    stated = open_geoid(path, u=0.01, interpolation="bilinear", correlation_length=1e5)
    assert (stated.errors, stated.interpolation) == (ErrorModel(0.01, 1e5), "bilinear")


def test_a_hybrid_model_says_what_it_was_fitted_to(tmp_path):
    path = write_isg(tmp_path / "land.isg", small_grid())
    text = path.read_text(encoding="utf-8")
    hybrid = text.replace("gravimetric", "hybrid").replace(
        "height datum   : ---", "height datum   : old harbour"
    )
    path.write_text(hybrid, encoding="utf-8")
    model = open_geoid(path, zero_level="height_reference")
    assert (model.hybrid, model.fitted_to) == (True, "old harbour")
    assert not open_geoid(write_cf(tmp_path / "a.nc", small_grid())).hybrid


def test_what_each_format_says_of_itself(tmp_path):
    grid = small_grid()
    missing = {
        write_cf(tmp_path / "a.nc", grid): [],
        write_ggxf(tmp_path / "a.ggxf", grid): [],
        write_isg(tmp_path / "a.isg", grid): ["zero_level"],
        write_geotiff(tmp_path / "a.tif", grid): ["quantity", "tide_system", "zero_level"],
        write_gtx(tmp_path / "a.gtx", grid): list(CONVENTIONS),
    }
    for path, fields in missing.items():
        assert list(missing_conventions(read_grid(path))) == fields, path.name


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("notes.nc", b"this is no grid at all\n" * 5, r"known format: starts with b'this is no g"),
        ("grid.tif", b"", r"not a grid of a known format.*grid\.tif.*CF netCDF, OGC GGXF"),
        ("grid.gtx", b"short", r"too short for a GTX grid: 5 bytes \(at grid\.gtx\)"),
        ("grid.gtx", b"word " * 40, r"not the header of a GTX grid.*grid\.gtx"),
        ("grid.isg", b"just some words\n", r"no header in the ISG file \(at grid\.isg\)"),
        ("grid.isg", b"\x00\xff\xfe\x00", r"an ISG grid is text, this file is not"),
        ("grid.nc", b"\x89HDF\r\n\x1a\n" + b"\x00" * 99, r"netCDF file cannot be read.*grid\.nc"),
        ("grid.nc", b"CDF\x01" + b"\x00" * 3, r"netCDF file cannot be read.*grid\.nc"),
        ("grid.tif", b"II*\x00" + b"\x07" * 99, r"GeoTIFF cannot be read.*grid\.tif"),
    ],
)
def test_files_that_are_no_grids(name, content, message, tmp_path):
    (tmp_path / name).write_bytes(content)
    with pytest.raises(DataError, match=message):
        open_geoid(tmp_path / name, **CONVENTIONS)


def test_a_file_that_is_not_there(tmp_path):
    write_cf(tmp_path / "land.nc", small_grid())
    with pytest.raises(DataError, match=r"not there: .*lend\.nc\. In that folder: land\.nc"):
        open_geoid(tmp_path / "lend.nc")


def test_the_format_is_recognised_without_an_ending(tmp_path):
    grid = small_grid()
    for write in (write_cf, write_ggxf, write_isg, write_geotiff, write_gtx):
        model = open_geoid(write(tmp_path / write.__name__, grid), **CONVENTIONS)
        assert model.sample(46.0, 10.0) == pytest.approx(float(grid.values[0, 0]), abs=4e-6)
        assert np.isfinite(model.sample(47.5, 11.0))
