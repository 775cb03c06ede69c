"""Series of the tide in memory and in files."""

from __future__ import annotations

import csv

import numpy as np
import pytest
import xarray

from clockgeo.errors import DataError, OutputError
from clockgeo.gravity import Place, SiteTide, tidal_potential, tide_series, write_tide_series
from clockgeo.times import DAY_NS, SECOND_NS, tai_from_iso

START = tai_from_iso("2016-12-31T00:00:00Z")
SITE, OTHER = SiteTide(Place(52.3, 10.5, 130.0)), SiteTide(Place(35.7, 139.6))


def test_series_is_the_tide_at_each_step():
    series = tide_series(START, START + DAY_NS, 3600.0, SITE)
    assert len(series.tai_ns) == 25
    tide = tidal_potential(series.tai_ns, SITE.place)
    assert np.array_equal(series.potential, tide.variable)
    assert np.array_equal(series.generating_potential, tide.generating)
    assert series.permanent_on_crust == pytest.approx(0.6941 * series.permanent_potential)


def test_difference_is_site_minus_other():
    pair = tide_series(START, START + DAY_NS, 3600.0, SITE, OTHER)
    one, two = (tide_series(START, START + DAY_NS, 3600.0, site) for site in (SITE, OTHER))
    assert np.array_equal(pair.potential, one.potential - two.potential)
    assert pair.permanent_potential == one.permanent_potential - two.permanent_potential


def test_intercontinental_pair_has_the_published_size():
    # a year of a pair on two continents: about ±5 to 6 m2 s-2 (Voigt et al. 2016: up to twice 3)
    series = tide_series(START, START + 365 * DAY_NS, 3600.0, OTHER, SITE)
    assert 5.0 < np.max(np.abs(series.potential)) < 6.5


def test_csv_holds_the_numbers(tmp_path):
    series = tide_series(START, START + DAY_NS, 21_600.0, SITE, OTHER)
    y = -series.potential / 299_792_458.0**2
    path = tmp_path / "tide.csv"
    write_tide_series(series, path, fractional_frequency=y)
    lines = path.read_text(encoding="utf-8").splitlines()
    rows = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    assert [float(row["potential (m2 s-2)"]) for row in rows] == series.potential.tolist()
    assert [float(row["fractional_frequency (1)"]) for row in rows] == y.tolist()
    assert rows[0]["utc"] == "2016-12-31T00:00:00.000Z"
    with pytest.raises(OutputError, match="exists already"):
        write_tide_series(series, path)
    write_tide_series(series, path, replace=True)


def test_netcdf_opens_with_utc_stamps_across_a_leap_second(tmp_path):
    series = tide_series(START, START + 2 * DAY_NS, 3600.0, SITE)
    path = tmp_path / "tide.nc"
    write_tide_series(series, path)
    with xarray.open_dataset(path) as dataset:
        assert np.array_equal(dataset["potential"].values, series.potential)
        assert np.array_equal(dataset["tai"].values, series.tai_ns)
        stamps = dataset["time"].values
        assert stamps[0] == np.datetime64("2016-12-31T00:00:00")
        # the day had 86 401 s, so 24 steps of an hour end one second before midnight
        assert stamps[24] == np.datetime64("2016-12-31T23:59:59") + np.timedelta64(1, "s")
        assert stamps[25] == np.datetime64("2017-01-01T00:59:59")
        assert dataset.attrs["Conventions"].startswith("CF-")


def test_bad_requests_are_refused(tmp_path):
    with pytest.raises(DataError, match="the step must be positive: 0"):
        tide_series(START, START + DAY_NS, 0.0, SITE)
    with pytest.raises(DataError, match=r"ends before it starts: 2016-12-31"):
        tide_series(START, START - DAY_NS, 60.0, SITE)
    with pytest.raises(DataError, match="too long: 86400000001 epochs"):
        tide_series(START, START + DAY_NS, 1e-6, SITE)
    with pytest.raises(DataError, match=r"unknown kind of file: .*tide\.txt"):
        write_tide_series(tide_series(START, START + SECOND_NS, 1.0, SITE), tmp_path / "tide.txt")
