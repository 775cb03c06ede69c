"""Writing and reading back, text and netCDF; and netCDF from elsewhere."""

from __future__ import annotations

import hashlib
import os
from fractions import Fraction

import netCDF4
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from clockgeo.errors import DataError, OutputError
from clockgeo.frequency import RecordLayout, find_transition, read_record, write_record
from clockgeo.frequency.writing import time_texts
from clockgeo.times import SECOND_NS, iso_utc, tai_from_iso

START = tai_from_iso("2016-12-31T23:50:00Z")
SR = find_transition("87Sr").frequency
NOMINAL = find_transition("171Yb").frequency / SR
ABOUT = {"nominal_ratio": NOMINAL, "carrier": SR}

LAYOUTS = {
    "plain": {"file": "a.txt"},
    "gzip": {"file": "a.txt.gz", "time": "iso8601"},
    "ratio": {"file": "a.txt", "value": "ratio", "flag_column": 4, "valid_flags": (1,)},
    "offset": {"file": "a.dat", "value": "offset", "value_column": "hertz", "time_column": "mjd"},
    "end": {"file": "a.txt", "stamp": "end", "interval": 1.0},
    "u": {"file": "a.txt", "u_column": 3},
    "ratio u": {"file": "a.txt", "u_column": 3, "value": "ratio"},
    "netcdf": {"file": "a.nc"},
    "netcdf middle": {"file": "a.nc", "stamp": "middle", "u_column": "u"},
    "netcdf ratio": {
        "file": "a.nc",
        "value": "ratio",
        "flag_column": "ok",
        "valid_flags": (2,),
        "value_column": "ratio",
        "time_column": "t",
    },
    "netcdf offset": {"file": "a.nc", "value": "offset", "value_column": "beat"},
}


def draw(rng, rows=1_500):
    """Rows through a leap second, some missing, some without a value."""
    kept = np.flatnonzero(rng.random(rows) > 0.1)
    y = rng.normal(0.0, 1e-15, kept.size)
    y[rng.random(kept.size) < 0.2] = np.nan
    y[0] = 1e-16
    return START + kept * SECOND_NS, y


@pytest.mark.parametrize("stated", LAYOUTS.values(), ids=LAYOUTS)
def test_what_is_written_is_read_back(tmp_path, rng, stated):
    layout = RecordLayout(**stated)
    tai, y = draw(rng)
    if layout.time == "mjd" and not layout.file.endswith(".nc"):
        # An MJD has no name for an instant within the leap second.
        outside = (tai < tai_from_iso("2016-12-31T23:59:60Z")) | (
            tai >= tai_from_iso("2017-01-01T00:00:00Z")
        )
        if layout.stamp == "end":
            outside &= tai + SECOND_NS != tai_from_iso("2016-12-31T23:59:60Z")
        tai, y = tai[outside], y[outside]
    u = np.full(tai.size, 2e-17) if layout.u_column is not None else None
    write_record(tmp_path / layout.file, tai, y, layout=layout, u=u, ratio_digits=30, **ABOUT)
    record = read_record(layout, base=tmp_path, name="lab", **ABOUT)
    np.testing.assert_array_equal(record.tai_ns, tai)
    np.testing.assert_array_equal(record.usable, np.isfinite(y))
    if layout.value == "fractional":
        np.testing.assert_array_equal(record.y, y)
    else:
        # Offsets: two roundings of a float64; ratios: half a unit of the 30th digit, 5e-30/1.2.
        atol = 5e-30 if layout.value == "ratio" else 0.0
        np.testing.assert_allclose(record.y, y, rtol=5e-16, atol=atol)
    if u is not None:
        np.testing.assert_allclose(record.u, u, rtol=1e-15)
    assert record.interval == 1.0
    assert np.all(np.diff(record.tick) == np.diff(tai) // SECOND_NS)


@pytest.mark.parametrize("stated", LAYOUTS.values(), ids=LAYOUTS)
def test_equal_input_gives_equal_bytes(tmp_path, rng, stated):
    layout = RecordLayout(**stated)
    tai, y = draw(rng, 100)
    u = np.full(tai.size, 2e-17)
    digests = set()
    for folder in ("one", "two"):
        (tmp_path / folder).mkdir()
        path = tmp_path / folder / layout.file
        write_record(path, tai, y, layout=layout, u=u, **ABOUT)
        digests.add(hashlib.sha256(content(path)).hexdigest())
        os.utime(tmp_path / folder, (0, 0))
    assert len(digests) == 1


def content(path):
    """Bytes of a file; of netCDF-4, which also notes the time of writing, all that it holds."""
    if path.suffix != ".nc":
        return path.read_bytes()
    with netCDF4.Dataset(path) as stored:
        parts = [repr(stored.__dict__)]
        for name, variable in stored.variables.items():
            parts += [
                name,
                str(variable.dtype),
                repr(variable.__dict__),
                repr(variable[:].tolist()),
            ]
    return "\n".join(parts).encode()


@given(y=hnp.arrays(np.float64, st.integers(1, 30), elements=st.floats(-1e-7, 1e-7)))
@settings(max_examples=40, deadline=None)
def test_every_float64_comes_back_from_text(tmp_path_factory, y):
    folder = tmp_path_factory.getbasetemp()
    tai = START - 10**12 + np.arange(y.size) * SECOND_NS
    layout = RecordLayout(file="floats.txt", interval=1.0)
    write_record(folder / "floats.txt", tai, y, layout=layout, replace=True)
    record = read_record(layout, base=folder, name="lab")
    np.testing.assert_array_equal(record.y, y)


def test_ratios_are_written_with_the_digits_asked_for(tmp_path):
    layout = RecordLayout(file="a.txt", value="ratio")
    path = tmp_path / "a.txt"
    write_record(path, [START], [0.0], layout=layout, nominal_ratio=NOMINAL, ratio_digits=18)
    # BIPM 2021 frequencies divided with 60 digits (bc): 1.207507039343337848...
    assert path.read_text().split("\t")[1].strip() == "1.20750703934333785"


@pytest.mark.parametrize(
    ("decimals", "text"),
    [
        (6, "57753.993056"),
        (0, "57754"),
        (14, "57753.99305555555556"),
        (15, "57753.993055555555556"),
        (None, "57753.99305555555556"),
    ],
)
def test_mjd_with_chosen_decimals(decimals, text):
    # 2016-12-31 is MJD 57753 and 23:50 is 0.9930555... d.
    assert time_texts(np.array([START]), kind="mjd", decimals=decimals)[0] == text


@pytest.mark.parametrize("decimals", [0, 3, 6, 9])
@pytest.mark.parametrize("later", [0, 599_999_999_999, 600_500_000_000, 601_000_000_000])
def test_iso_texts_agree_with_single_instants(decimals, later):
    instant = START + later
    text = time_texts(np.array([instant]), kind="iso8601", decimals=decimals)[0]
    assert text == iso_utc(instant, digits=decimals)


@pytest.mark.parametrize(("kind", "decimals"), [("mjd", 16), ("iso8601", 10), ("mjd", -1)])
def test_too_many_decimals_are_refused(kind, decimals):
    with pytest.raises(DataError, match="so many decimals"):
        time_texts(np.array([START]), kind=kind, decimals=decimals)


def test_stamps_rounded_as_in_real_records_are_read_on_the_same_ticks(tmp_path, rng):
    kept = np.flatnonzero(rng.random(5_000) > 0.3)
    tai = START + 10**13 + np.rint(kept * 1.0568e9).astype(np.int64)
    layout = RecordLayout(file="a.txt")
    y = rng.normal(0.0, 1e-16, tai.size)
    write_record(tmp_path / "a.txt", tai, y, layout=layout, stamp_decimals=6)
    record = read_record(layout, base=tmp_path, name="lab")
    assert record.interval == 1.0568
    np.testing.assert_array_equal(np.diff(record.tick), np.diff(kept))


def test_an_existing_file_is_not_replaced_unless_asked(tmp_path):
    layout = RecordLayout(file="a.txt")
    write_record(tmp_path / "a.txt", [START], [0.0], layout=layout)
    with pytest.raises(OutputError, match="exists already"):
        write_record(tmp_path / "a.txt", [START], [1e-17], layout=layout)
    write_record(tmp_path / "a.txt", [START], [1e-17], layout=layout, replace=True)


@pytest.mark.parametrize(
    ("stated", "given_", "problem"),
    [
        ({}, {"y": [0.0, 1.0]}, "one common length"),
        ({}, {"y": [np.inf]}, "is infinite"),
        ({}, {"tai_ns": [], "y": []}, "at least 1"),
        ({"value": "ratio"}, {}, "need the nominal ratio"),
        ({"value": "offset"}, {}, "need the optical frequency"),
        ({"u_column": 3}, {}, "no u is given"),
        ({"u_column": 3}, {"u": [1e-17, 1e-17]}, "one common length"),
        ({"u_column": 2}, {"u": [1e-17]}, "two columns of the layout are the same"),
    ],
)
def test_columns_that_do_not_fit_are_refused(tmp_path, stated, given_, problem):
    layout = RecordLayout(file="a.txt", **stated)
    columns = {"tai_ns": [START], "y": [0.0], **given_}
    with pytest.raises(DataError, match=problem):
        write_record(
            tmp_path / "a.txt", columns.pop("tai_ns"), columns.pop("y"), layout=layout, **columns
        )
    assert not list(tmp_path.iterdir())


def test_netcdf_follows_cf(tmp_path):
    layout = RecordLayout(file="a.nc", flag_column="ok", valid_flags=(1,), u_column="u")
    write_record(tmp_path / "a.nc", [START], [1e-17], layout=layout, u=[1e-18])
    with netCDF4.Dataset(tmp_path / "a.nc") as dataset:
        assert dataset.Conventions.startswith("CF-1.")
        assert dataset["time"].standard_name == "time"
        assert dataset["time"].calendar == "tai"
        assert dataset["fractional_frequency"].units == "1"
        assert dataset["fractional_frequency"].ancillary_variables == "u ok"
        assert dataset["ok"].flag_meanings == "not_usable usable"


def foreign(
    path,
    *,
    units="days since 1858-11-17",
    calendar="standard",
    kind="f8",
    times=(60_400.0, 60_400.5),
    values=(1e-17, 2e-17),
    **attributes,
):
    """A netCDF record as somebody else might write it."""
    with netCDF4.Dataset(path, "w") as dataset:
        dataset.createDimension("n", len(times))
        time = dataset.createVariable("when", kind, ("n",))
        time.setncatts({"units": units, "calendar": calendar} if calendar else {"units": units})
        time[:] = times
        value = dataset.createVariable("y", "f8", ("n",), fill_value=-999.0)
        value.setncatts(attributes)
        value[:] = values


FOREIGN = {"file": "f.nc", "time_column": "when", "value_column": "y"}


@pytest.mark.parametrize(
    ("units", "calendar", "times"),
    [
        ("days since 1858-11-17", "standard", (60_400.0, 60_400.5)),
        ("days since 1858-11-17 00:00:00", None, (60_400.0, 60_400.5)),
        ("seconds since 2024-03-31T00:00:00Z", "proleptic_gregorian", (0.0, 43_200.0)),
        ("hours since 2024-3-31 0:0:0", "gregorian", (0.0, 12.0)),
        ("milliseconds since 2024-03-31", "utc", (0.0, 43_200_000.0)),
        # TAI is 37 s ahead of UTC since 2017 (IERS Bulletin C).
        ("s since 2024-03-31T00:00:37", "tai", (0.0, 43_200.0)),
    ],
)
def test_cf_times_of_every_kind(tmp_path, units, calendar, times):
    foreign(tmp_path / "f.nc", units=units, calendar=calendar, times=times)
    record = read_record(RecordLayout(**FOREIGN), base=tmp_path, name="lab")
    assert [iso_utc(int(t)) for t in record.tai_ns] == [
        "2024-03-31T00:00:00.000Z",
        "2024-03-31T12:00:00.000Z",
    ]


def test_fill_values_are_missing(tmp_path):
    foreign(tmp_path / "f.nc", values=(1e-17, -999.0))
    record = read_record(RecordLayout(**FOREIGN), base=tmp_path, name="lab")
    assert record.usable.tolist() == [True, False]


def test_packed_values_are_unpacked(tmp_path):
    with netCDF4.Dataset(tmp_path / "f.nc", "w") as dataset:
        dataset.createDimension("n", 3)
        time = dataset.createVariable("when", "f8", ("n",))
        time.units = "days since 1858-11-17"
        time[:] = [60_400.0, 60_400.5, 60_401.0]
        value = dataset.createVariable("y", "i4", ("n",), fill_value=-1)
        value.scale_factor = 1e-19
        value.set_auto_maskandscale(False)
        value[:] = [100, -1, 300]
    record = read_record(RecordLayout(**FOREIGN), base=tmp_path, name="lab")
    np.testing.assert_allclose(record.y, [1e-17, np.nan, 3e-17], rtol=1e-15)
    assert record.usable.tolist() == [True, False, True]


@pytest.mark.parametrize(
    ("written", "stated", "problem"),
    [
        ({"units": "days"}, {}, "no CF units: 'days'"),
        ({"units": "fortnights since 2024-01-01"}, {}, "no CF units"),
        ({"calendar": "noleap"}, {}, "cannot use this calendar: noleap"),
        ({"kind": "f4"}, {}, "float32 times"),
        ({}, {"value_column": "yy"}, "no such variable for value_column: 'yy'.*Did you mean 'y'"),
        ({}, {"value_column": 2}, "Give the variable by its name"),
        ({}, {"value": "ratio"}, "full ratios must be text"),
        ({"times": (60_400.0, np.nan)}, {}, "1 of 2 rows cannot be used.*row 2: the time is not"),
        ({"times": (60_400.0, 1e9)}, {}, "1 of 2 rows.*row 2: the time lies outside"),
        ({"values": (np.nan, np.nan)}, {}, "no row is usable"),
        ({"values": (1e-17, np.inf)}, {}, "row 2: the value is not finite"),
    ],
)
def test_foreign_netcdf_with_a_fault_is_refused(tmp_path, written, stated, problem):
    foreign(tmp_path / "f.nc", **written)
    with pytest.raises(DataError, match=problem):
        read_record(
            RecordLayout(**{**FOREIGN, **stated}),
            base=tmp_path,
            name="lab",
            nominal_ratio=Fraction(1),
        )


@pytest.mark.parametrize(
    "content", [b"", b"CDF\x01", b"\x89HDF\r\n\x1a\n" + b"\0" * 50, b"60400 1e-17"]
)
def test_a_damaged_netcdf_is_refused(tmp_path, content):
    (tmp_path / "f.nc").write_bytes(content)
    with pytest.raises(DataError, match="not netCDF, or is damaged"):
        read_record(RecordLayout(**FOREIGN), base=tmp_path, name="lab")


def test_time_errors_are_not_written(tmp_path):
    layout = RecordLayout(file="x.txt", value="time_error")
    with pytest.raises(DataError, match="time errors are read, not written"):
        write_record(tmp_path / "x.txt", np.arange(3) * 10**9, np.zeros(3), layout=layout)
