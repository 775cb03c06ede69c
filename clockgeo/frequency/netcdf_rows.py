"""Rows of a record from netCDF with CF time coordinates."""

from __future__ import annotations

import difflib
import re
from datetime import datetime, timedelta
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.layout import Column, RecordLayout
from clockgeo.frequency.ratio import (
    decimal_places,
    fractional_frequency,
    fractional_from_decimals,
)
from clockgeo.frequency.rows import FIRST_MJD, IMPOSSIBLE_DAY, LAST_MJD, BadRows, Rows
from clockgeo.times import DAY_NS, tai_from_mjd_utc

__all__ = ["TIME_VARIABLE", "VALUE_VARIABLE", "netcdf_rows"]

TIME_VARIABLE = "time"
VALUE_VARIABLE = "fractional_frequency"
_UNIT_NS = {
    "nanosecond": 1,
    "ns": 1,
    "microsecond": 1_000,
    "us": 1_000,
    "millisecond": 1_000_000,
    "ms": 1_000_000,
    "second": 1_000_000_000,
    "sec": 1_000_000_000,
    "s": 1_000_000_000,
    "minute": 60_000_000_000,
    "min": 60_000_000_000,
    "hour": 3_600_000_000_000,
    "h": 3_600_000_000_000,
    "day": DAY_NS,
    "d": DAY_NS,
}
_SINCE = re.compile(
    r"\s*(\w+)\s+since\s+(\d{4}-\d\d?-\d\d?)(?:[T ](\d\d?:\d\d?(?::\d\d?(?:\.0*)?)?))?Z?"
)
_UTC_CALENDARS = {"standard", "gregorian", "proleptic_gregorian", "utc"}
_TAI_ORIGIN = datetime(1958, 1, 1)  # noqa: DTZ001  (TAI has no time zone)
_ONE_MICROSECOND = timedelta(microseconds=1)
_ORIGIN_MJD = 36_204


def netcdf_rows(
    path: Path, layout: RecordLayout, *, nominal: Fraction | None, where: str, bad: BadRows
) -> Rows:
    """Read the rows of one netCDF file.

    The time variable carries CF units (``"days since 1858-11-17"``, ``"nanoseconds since ..."``)
    and a calendar; ``tai`` counts every second, the others are UTC days of 86 400 s. Full ratios
    are text variables, because a float64 has lost their last digits.

    Parameters
    ----------
    path : Path
        The file.
    layout : RecordLayout
        Its columns are variable names; ``time`` and ``fractional_frequency`` where not stated.
    nominal : Fraction or None
        Nominal ratio, or carrier in Hz.
    where : str
        The file, for messages.
    bad : BadRows
        Gains the rows that have no finite time; they are left out.

    Raises
    ------
    DataError
        If the file is no netCDF, or a variable is missing or of the wrong kind.
    """
    import netCDF4

    try:
        dataset = netCDF4.Dataset(path)
    except (OSError, RuntimeError) as error:
        raise DataError(
            "the file is not netCDF, or is damaged",
            value=str(error.args[-1]) if error.args else None,
            where=where,
            advice="Copy it again from its source, or state format = 'text'",
        ) from None
    with dataset:
        dataset.set_auto_mask(False)
        variables = _Variables(dataset.variables, layout, where)
        time = variables.of("time_column", TIME_VARIABLE)
        tai, finite, possible = _times(time, where)
        y = _values(variables.of("value_column", VALUE_VARIABLE), layout, nominal, where)
        usable = ~np.isnan(y)
        if layout.flag_column is not None:
            usable &= _allowed(variables.of("flag_column", ""), layout)
        u = None
        if layout.u_column is not None:
            u = _floats(variables.of("u_column", ""), where)
            u = u if nominal is None else u / float(nominal)
    lengths = {column.shape for column in (tai, y, usable, *([] if u is None else [u]))}
    if len(lengths) != 1 or tai.ndim != 1 or tai.size == 0:
        raise DataError("the variables need one common length", value=lengths, where=where)
    for row in np.flatnonzero(~possible).tolist():
        bad.add(
            f"{where}, row {row + 1}", IMPOSSIBLE_DAY if finite[row] else "the time is not finite"
        )
    return Rows(where, tai, y, usable, u, np.arange(1, tai.size + 1), unit="row").kept(possible)


class _Variables:
    """The variables a layout names."""

    def __init__(self, variables: Any, layout: RecordLayout, where: str) -> None:
        self.variables, self.layout, self.where = variables, layout, where

    def of(self, key: str, default: str) -> Any:
        """Give the variable that `key` of the layout names."""
        name: Column = getattr(self.layout, key)
        if default and key not in self.layout.model_fields_set:
            name = default
        if name in self.variables:
            return self.variables[name]
        near = difflib.get_close_matches(str(name), list(self.variables), n=1, cutoff=0.4)
        raise DataError(
            f"there is no such variable for {key}",
            value=repr(name),
            where=self.where,
            allowed=f"The file holds {', '.join(self.variables)}",
            advice=f"Did you mean {near[0]!r}?" if near else "Give the variable by its name",
        )


def _times(
    variable: Any, where: str
) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.bool_]]:
    """TAI of every element, where it is finite, and where it lies in the years of UTC."""
    units, calendar = getattr(variable, "units", ""), getattr(variable, "calendar", "standard")
    match = _SINCE.fullmatch(units)
    unit = _UNIT_NS.get(_singular(match[1])) if match else None
    if match is None or unit is None:
        raise DataError(
            "the time variable has no CF units",
            value=repr(units),
            where=f"{where}, variable {variable.name}",
            allowed="Such as 'days since 1858-11-17' or 'seconds since 2027-01-01T00:00:00'",
        )
    if calendar not in _UTC_CALENDARS | {"tai"}:
        raise DataError(
            "a record cannot use this calendar",
            value=calendar,
            where=f"{where}, variable {variable.name}",
            allowed=f"tai, {', '.join(sorted(_UTC_CALENDARS))}",
        )
    if variable.dtype == np.float32:
        raise DataError(
            "float32 times are rounded to minutes",
            where=f"{where}, variable {variable.name}",
            allowed="float64 or int64",
        )
    since = datetime.fromisoformat(f"{_two_digits(match[2])}T{_two_digits(match[3] or '00:00')}")
    passed = (since - _TAI_ORIGIN) // _ONE_MICROSECOND * 1_000
    values = np.asarray(variable[:])
    finite = np.isfinite(values)
    possible = finite & (np.abs(np.where(finite, values, 0.0)) * (unit / DAY_NS) < LAST_MJD)
    elapsed = _nanoseconds(np.where(possible, values, 0), unit) + passed
    offset = FIRST_MJD - _ORIGIN_MJD
    if calendar == "tai":
        possible &= (elapsed > offset * DAY_NS) & (elapsed < (LAST_MJD - _ORIGIN_MJD) * DAY_NS)
        return elapsed, finite, possible
    day, rest = np.divmod(elapsed, DAY_NS)
    possible &= (day >= offset) & (day <= LAST_MJD - _ORIGIN_MJD)
    return tai_from_mjd_utc(np.where(possible, day, offset) + _ORIGIN_MJD, rest), finite, possible


def _two_digits(text: str) -> str:
    """Numbers of a date or a time of day with two digits each, as ISO 8601 wants them."""
    return re.sub(r"(?<![\d.])(\d)(?!\d)", r"0\1", text.partition(".")[0])


def _singular(unit: str) -> str:
    unit = unit.lower()
    return unit if unit in _UNIT_NS else unit.removesuffix("s")


def _nanoseconds(values: NDArray[Any], unit: int) -> NDArray[np.int64]:
    """Whole ns of finite counts in `unit` ns; floats are split so that products stay exact."""
    if np.issubdtype(values.dtype, np.integer):
        return np.asarray(values.astype(np.int64) * unit)
    whole = np.floor(values.astype(np.float64))
    rest = np.rint((values - whole) * unit)
    return np.asarray(whole.astype(np.int64) * unit + rest.astype(np.int64))


def _values(
    variable: Any, layout: RecordLayout, nominal: Fraction | None, where: str
) -> NDArray[np.float64]:
    place = f"{where}, variable {variable.name}"
    if layout.value == "ratio" and nominal is not None:
        if variable.dtype is not str:
            raise DataError(
                "full ratios must be text: a float64 has lost their last digits",
                value=str(variable.dtype),
                where=place,
                advice="Write the ratios as a string variable, or as fractional deviations",
            )
        return _ratios([str(text).strip() for text in variable[:]], nominal)
    values = _floats(variable, where)
    return values if nominal is None else values / float(nominal)


def _ratios(texts: list[str], nominal: Fraction) -> NDArray[np.float64]:
    """Ratios column by column; texts that do not parse as decimals one by one; blanks missing."""
    import polars as pl

    column = pl.Series(texts, dtype=pl.String)
    decimals = column.cast(pl.Decimal(38, decimal_places(nominal)), strict=False)
    y = fractional_from_decimals(decimals, nominal)
    missing = column.str.to_lowercase().is_in(["", "nan"])
    odd = np.flatnonzero((decimals.is_null() & ~missing).to_numpy())
    if odd.size:
        y = y.copy()
        y[odd] = fractional_frequency([texts[row] for row in odd.tolist()], nominal)
    return y


def _floats(variable: Any, where: str) -> NDArray[np.float64]:
    """Numbers with their missing ones as NaN, scale and offset applied."""
    if variable.dtype is str or not np.issubdtype(variable.dtype, np.number):
        raise DataError("not a numeric variable", value=variable.name, where=where)
    variable.set_auto_mask(True)
    values = np.ma.asarray(variable[:], dtype=np.float64)
    return np.asarray(np.ma.filled(values, np.nan))


def _allowed(variable: Any, layout: RecordLayout) -> NDArray[np.bool_]:
    flags = np.asarray(variable[:])
    if np.issubdtype(flags.dtype, np.number):
        return np.isin(flags, [int(flag) for flag in layout.valid_flags if _is_integer(flag)])
    return np.isin(flags.astype(str), [str(flag) for flag in layout.valid_flags])


def _is_integer(flag: int | str) -> bool:
    return isinstance(flag, int) or re.fullmatch(r"[+-]?\d+", flag) is not None
