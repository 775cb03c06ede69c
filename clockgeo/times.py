"""One time line for both wings: integer nanoseconds of TAI.

A record's stamps are UTC; UTC has leap seconds, so elapsed time is counted in TAI. Inside, an
instant is an int64 count of nanoseconds since 1958-01-01T00:00:00 TAI, the origin of that scale
(valid from 1972, when UTC took its present form, to 2250). The leap seconds come from ERFA's table.
"""

from __future__ import annotations

import re
from datetime import UTC, datetime
from decimal import Decimal

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError

__all__ = [
    "DAY_NS",
    "SECOND_NS",
    "iso_utc",
    "mjd_utc",
    "mjd_utc_parts",
    "tai_from_iso",
    "tai_from_mjd_utc",
    "tt_julian_date",
    "utc_julian_date",
]

SECOND_NS = 1_000_000_000
DAY_NS = 86_400 * SECOND_NS
_ORIGIN_MJD = 36_204  # 1958-01-01
_FIRST_MJD = 41_317  # 1972-01-01: UTC with whole leap seconds starts here
_LAST_MJD = 142_000
_MJD_OFFSET = 2_400_000.5
_TT_MINUS_TAI = 32.184  # s, exact by definition of TT


def _leap_table() -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Days (MJD) from which TAI - UTC has a new value, and the values in whole seconds."""
    table = erfa.leap_seconds.get()
    table = table[table["year"] >= 1972]
    first = erfa.cal2jd(table["year"], table["month"], 1)[1]
    return first.astype(np.int64), np.rint(table["tai_utc"]).astype(np.int64)


def tai_from_mjd_utc(day: ArrayLike, nanosecond: ArrayLike) -> NDArray[np.int64]:
    """TAI nanoseconds of a UTC day number and the time since that day's midnight.

    Parameters
    ----------
    day : integer array
        Modified Julian Day number (UTC).
    nanosecond : integer array, same shape
        Time of day in ns, 0 <= t < 86 400e9. A stamp inside a leap second cannot be told from the
        second after it, as in every record kept in MJD.

    Returns
    -------
    int64 array
        Nanoseconds of TAI since 1958-01-01T00:00:00 TAI.

    Raises
    ------
    DataError
        If a day lies outside 1972..2247.
    """
    days = np.asarray(day, dtype=np.int64)
    outside = (days < _FIRST_MJD) | (days > _LAST_MJD)
    if np.any(outside):
        raise DataError(
            "a time stamp lies outside the years 1972 to 2247",
            value=f"MJD {np.atleast_1d(days)[np.atleast_1d(outside)][0]}",
            allowed="Modified Julian Days in UTC, such as 60310.5",
            advice="Check which column holds the time, and its unit",
        )
    first_days, offsets = _leap_table()
    ends = np.searchsorted(first_days, [days.min(), days.max()], side="right") if days.size else [0]
    if ends[0] == ends[-1]:  # no leap second in between: one offset for all
        tai_minus_utc = offsets[ends[0] - 1]
    else:
        tai_minus_utc = offsets[np.searchsorted(first_days, days, side="right") - 1]
    since_origin = (days - _ORIGIN_MJD) * DAY_NS + np.asarray(nanosecond, dtype=np.int64)
    return np.asarray(since_origin + tai_minus_utc * SECOND_NS)


def _split_utc(tai_ns: ArrayLike) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """UTC day number and nanoseconds of the day (86 400e9 and more inside a leap second)."""
    tai = np.asarray(tai_ns, dtype=np.int64)
    first_days, offsets = _leap_table()
    starts = (first_days - _ORIGIN_MJD) * DAY_NS + offsets * SECOND_NS
    era = np.maximum(np.searchsorted(starts, tai, side="right") - 1, 0)
    utc = tai - offsets[era] * SECOND_NS
    day = utc // DAY_NS
    # An instant before the next era starts but after its midnight lies inside the leap second.
    last_day = np.append(first_days[1:], _LAST_MJD + 1)[era] - 1 - _ORIGIN_MJD
    day = np.minimum(day, last_day)
    return day + _ORIGIN_MJD, utc - day * DAY_NS


def mjd_utc_parts(tai_ns: ArrayLike) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """UTC day number (MJD) and ns of that day, exact; 86 400e9 ns and more in a leap second."""
    return _split_utc(tai_ns)


def mjd_utc(tai_ns: ArrayLike) -> NDArray[np.float64]:
    """Modified Julian Date (UTC) as float64, good to about 1 µs; for display and files only."""
    day, nanosecond = _split_utc(tai_ns)
    return np.asarray(day + np.minimum(nanosecond, DAY_NS - 1000) / DAY_NS)


def iso_utc(tai_ns: int, *, digits: int = 3) -> str:
    """ISO 8601 text in UTC with `digits` decimals of a second and the letter Z.

    >>> iso_utc(tai_from_iso("2016-12-31T23:59:60.5Z"))
    '2016-12-31T23:59:60.500Z'
    """
    step = 10 ** (9 - digits)
    rounded = (int(tai_ns) + step // 2) // step * step
    day, nanosecond = (int(part) for part in _split_utc(rounded))
    date = datetime.fromordinal(day + 678_576)
    minutes = min(nanosecond // (60 * SECOND_NS), 1439)
    second, fraction = divmod(nanosecond - minutes * 60 * SECOND_NS, SECOND_NS)
    tail = f".{fraction // step:0{digits}d}" if digits else ""
    return f"{date:%Y-%m-%d}T{minutes // 60:02d}:{minutes % 60:02d}:{second:02d}{tail}Z"


_ISO = re.compile(
    r"(\d{4})-(\d\d)-(\d\d)(?:[T ](\d\d):(\d\d)(?::(\d\d(?:[.,]\d+)?))?)?\s*(Z|[+-]\d\d:?\d\d)?"
)


def tai_from_iso(text: str) -> int:
    """TAI nanoseconds of one ISO 8601 instant; no zone means UTC.

    Seconds may carry any number of decimals (kept to 1 ns) and may be 60 in a leap second.

    Raises
    ------
    DataError
        If the text is not a date and time of ISO 8601, or names a day that does not exist.
    """
    match = _ISO.fullmatch(text.strip())
    try:
        if match is None:
            raise ValueError
        year, month, day, hour, minute = (int(part or 0) for part in match.groups()[:5])
        second = Decimal((match.group(6) or "0").replace(",", "."))
        if second >= 61:
            raise ValueError
        midnight = datetime(year, month, day, hour, minute, tzinfo=UTC)
    except ValueError:
        raise DataError(
            "not a date and time",
            value=repr(text),
            allowed="ISO 8601, such as 2027-03-01T12:00:00Z",
        ) from None
    zone = match.group(7)
    offset = 0
    if zone and zone != "Z":
        sign = -1 if zone[0] == "-" else 1
        offset = sign * (int(zone[1:3]) * 60 + int(zone[-2:]))
    minutes = hour * 60 + minute - offset
    days, minutes = divmod(minutes, 1440)
    mjd = midnight.toordinal() - 678_576 + days
    return int(tai_from_mjd_utc(mjd, minutes * 60 * SECOND_NS + int(second * SECOND_NS)))


def tt_julian_date(tai_ns: ArrayLike) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Terrestrial Time as a two-part Julian Date, for ephemerides."""
    tai = np.asarray(tai_ns, dtype=np.int64)
    day, rest = np.divmod(tai, DAY_NS)
    days = np.asarray(day + (_ORIGIN_MJD + _MJD_OFFSET), dtype=np.float64)
    return days, np.asarray((rest / SECOND_NS + _TT_MINUS_TAI) / 86_400.0)


def utc_julian_date(tai_ns: ArrayLike) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """UTC as a two-part Julian Date; stands in for UT1 (within 0.9 s) where rotation is needed."""
    day, nanosecond = _split_utc(tai_ns)
    return np.asarray(day + _MJD_OFFSET, dtype=np.float64), np.asarray(nanosecond / DAY_NS)
