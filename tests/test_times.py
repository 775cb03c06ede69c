"""The time line: leap seconds, exactness, there and back."""

from __future__ import annotations

import erfa
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.times import (
    DAY_NS,
    SECOND_NS,
    iso_utc,
    mjd_utc,
    tai_from_iso,
    tai_from_mjd_utc,
    tt_julian_date,
    utc_julian_date,
)


# IERS Bulletin C 52: TAI - UTC = 36 s until 2016-12-31, 37 s from 2017-01-01.
def test_the_last_leap_second():
    before, after = tai_from_iso("2016-12-31T23:59:59Z"), tai_from_iso("2017-01-01T00:00:00Z")
    assert after - before == 2 * SECOND_NS
    assert tai_from_iso("2016-12-31T23:59:60Z") - before == SECOND_NS


def test_the_leap_second_has_a_name_of_its_own():
    inside = tai_from_iso("2016-12-31T23:59:60.25Z")
    assert iso_utc(inside) == "2016-12-31T23:59:60.250Z"
    assert mjd_utc(inside) < 57_754.0


@given(st.integers(41_317, 80_000), st.integers(0, DAY_NS - 1))
def test_mjd_there_and_back(day, nanosecond):
    tai = int(tai_from_mjd_utc(day, nanosecond))
    assert_close(float(mjd_utc(tai)), day + nanosecond / DAY_NS, tolerance=1e-10)
    assert tai_from_iso(iso_utc(tai, digits=9)) == tai


@given(st.integers(41_400, 61_800), st.integers(0, 86_399))
def test_against_erfa(day, second):
    """Second route: ERFA's UTC -> TAI -> TT in quasi-Julian dates, good to 20 microseconds here."""
    tai = tai_from_mjd_utc(day, second * SECOND_NS)
    utc = erfa.dtf2d(
        "UTC", *erfa.jd2cal(2_400_000.5, day)[:3], second // 3600, second // 60 % 60, second % 60
    )
    expected = erfa.taitt(*erfa.utctai(*utc))
    got = tt_julian_date(tai)
    assert abs((got[0] - expected[0]) + (got[1] - expected[1])) * 86_400 < 2e-5


def test_utc_date_is_the_day_and_its_fraction():
    day, fraction = utc_julian_date(tai_from_iso("2027-05-03T12:00:00Z"))
    assert day + fraction == 2_400_000.5 + 61_528.5


@pytest.mark.parametrize(
    ("text", "same_as"),
    [
        ("2027-05-03 06:00", "2027-05-03T06:00:00Z"),
        ("2027-05-03", "2027-05-03T00:00:00Z"),
        ("2027-05-03T08:00:00+02:00", "2027-05-03T06:00:00Z"),
        ("2027-05-03T00:30:00+01:00", "2027-05-02T23:30:00Z"),
        ("2027-05-03T06:00:00,5Z", "2027-05-03T06:00:00.5Z"),
    ],
)
def test_spellings_of_one_instant(text, same_as):
    assert tai_from_iso(text) == tai_from_iso(same_as)


@pytest.mark.parametrize("text", ["", "yesterday", "2027-13-01", "2027-02-30", "2027-05-03T25:00Z"])
def test_what_is_no_instant_is_refused(text):
    with pytest.raises(DataError, match=r"not a date and time: .*ISO 8601"):
        tai_from_iso(text)


@pytest.mark.parametrize("day", [0, 41_316, 150_000, 2_460_000])
def test_days_of_no_use_are_refused(day):
    with pytest.raises(DataError, match=rf"outside the years 1972 to 2247: MJD {day}"):
        tai_from_mjd_utc(np.array([60_000, day]), np.array([0, 0]))
