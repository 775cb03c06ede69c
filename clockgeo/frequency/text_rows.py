"""Rows of a record from text: exact times and values, column by column.

Whole columns are read as 128-bit decimals or floats; the few rows that do not parse that way (odd
spellings, exponents, damage) are looked at one by one as exact numbers.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.layout import RecordLayout
from clockgeo.frequency.parts import in_parts
from clockgeo.frequency.ratio import NUMBER, decimal_places, fractional_from_decimals
from clockgeo.frequency.rows import FIRST_MJD, IMPOSSIBLE_DAY, LAST_MJD, BadRows, Rows
from clockgeo.frequency.text_table import Columns, Content, open_table, unpacked
from clockgeo.times import DAY_NS, tai_from_iso, tai_from_mjd_utc

if TYPE_CHECKING:
    import polars as pl

__all__ = ["text_rows"]

_MJD_PLACES = 14
"""Decimals of an MJD: one step is 0.864 ns, so that every nanosecond comes back."""
_REFERENCE_MJD = 58_849
"""Steps are counted from here; 64 bits then hold the years 1768 to 2272."""
_UNIX_EPOCH_MJD = 40_587
_NOWHERE = -(9 * 10**18)
"""Stands for a missing time: some day before 1900 in either count."""
_NOT_FINITE = {"nan", "inf", "infinity"}


def text_rows(
    path: Path,
    content: Content,
    layout: RecordLayout,
    *,
    nominal: Fraction | None,
    where: str,
    bad: BadRows,
) -> Rows:
    """Read the rows of one text file.

    Parameters
    ----------
    path : Path
        The file.
    content : bytes or mapped file
        Its bytes as stored, gzip'd or not.
    layout : RecordLayout
        What its columns mean.
    nominal : Fraction or None
        Nominal ratio, or carrier in Hz, that values are referred to; None for fractional values.
    where : str
        The file, for messages.
    bad : BadRows
        Gains the rows that cannot be used; they are left out of the result.

    Raises
    ------
    DataError
        If the file is not text, or has no such columns.
    """
    import polars as pl

    text = unpacked(content, where=where)
    table = open_table(text, where=where, path=path if text is content else None)
    columns: dict[str, tuple[int, pl.DataType]] = {
        "time": (table.position(layout.time_column), _time_type(layout)),
        "value": (table.position(layout.value_column), _value_type(layout, nominal)),
    }
    if layout.flag_column is not None:
        columns["flag"] = (table.position(layout.flag_column), _flag_type(layout))
    if layout.u_column is not None:
        columns["u"] = (table.position(layout.u_column), pl.Float64())
    read = table.columns(columns)
    if "flag" in columns and read.frame["flag"].null_count():
        # Words among numbers, or missing flags, are told apart as text.
        columns["flag"] = (columns["flag"][0], pl.String())
        read = table.columns(columns)
    frame, lines = read.frame, read.lines
    tai, timed = _times(frame["time"], layout)
    y = _values(frame["value"], layout, nominal)
    u = None if layout.u_column is None else _fractional(frame["u"].to_numpy(), layout, nominal)
    keep = timed
    unread = ~timed
    for name in frame.columns:
        if frame[name].null_count():
            unread |= frame[name].is_null().to_numpy()
    if np.any(unread):
        tai, y, keep = tai.copy(), y.copy(), timed.copy()
        u = None if u is None else u.copy()
        look = _SecondLook(layout, nominal, tai, y, u, keep)
        for cells in _cells(read, unread, timed):
            look.row(cells, f"{where}, line {lines[cells['row']]}", bad)
    usable = ~np.isnan(y)
    if layout.flag_column is not None:
        usable &= _allowed(frame["flag"], layout)
    rows = Rows(where, tai, y, usable, u, lines)
    return rows if keep.all() else rows.kept(keep)


def _time_type(layout: RecordLayout) -> pl.DataType:
    import polars as pl

    return pl.Decimal(38, _MJD_PLACES) if layout.time == "mjd" else pl.String()


def _value_type(layout: RecordLayout, nominal: Fraction | None) -> pl.DataType:
    import polars as pl

    if layout.value == "ratio" and nominal is not None:
        return pl.Decimal(38, decimal_places(nominal))
    return pl.Float64()


def _flag_type(layout: RecordLayout) -> pl.DataType:
    """Numbers where all stated flags are: they are read in a fraction of the time of words."""
    import polars as pl

    words = [flag for flag in layout.valid_flags if _number_or_none(str(flag)) is None]
    return pl.String() if words else pl.Float64()


def _times(column: pl.Series, layout: RecordLayout) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """TAI of every row, and where it is known."""
    counted, split = (
        (_mjd_steps(column), _split_steps)
        if layout.time == "mjd"
        else (_unix_times(column), _split_unix)
    )
    elapsed = counted.fill_null(_NOWHERE).to_numpy()
    tai = np.empty(elapsed.size, dtype=np.int64)
    known = np.empty(elapsed.size, dtype=bool)
    for part in in_parts(elapsed.size):
        day, rest = split(elapsed[part])
        known[part] = (day >= FIRST_MJD) & (day <= LAST_MJD)
        if not np.all(known[part]):
            day[~known[part]] = FIRST_MJD
        tai[part] = tai_from_mjd_utc(day, rest)
    return tai, known


def _mjd_steps(column: pl.Series) -> pl.Series:
    """Units of the last decimal since the reference day, 64 bits; null where there is none."""
    import polars as pl

    reference = pl.lit(_REFERENCE_MJD * 10**_MJD_PLACES, dtype=pl.Int128)
    steps = (pl.col("time").to_physical() - reference).cast(pl.Int64, strict=False)
    return column.to_frame("time").select(steps)["time"]


def _split_steps(elapsed: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """MJD and nanosecond of the day of `_mjd_steps`."""
    day = elapsed // 10**_MJD_PLACES
    # A day has 864e11 ns and 1000e11 steps; the product stays below 2^63.
    rest = ((elapsed - day * 10**_MJD_PLACES) * 864 + 500) // 1_000
    full = rest == DAY_NS
    rest[full] = 0
    return day + (_REFERENCE_MJD + full), rest


def _unix_times(column: pl.Series) -> pl.Series:
    """UTC ns since 1970 of plain ISO 8601 texts; null for zones, leap seconds and short forms."""
    import polars as pl

    text = pl.col("time").str.strip_suffix("Z").str.replace(" ", "T", literal=True)
    plain = (
        pl.when(~pl.col("time").str.contains(":60", literal=True))
        .then(text)
        .str.strptime(pl.Datetime("ns"), "%Y-%m-%dT%H:%M:%S%.f", strict=False)
    )
    return column.to_frame("time").select(plain.cast(pl.Int64))["time"]


def _split_unix(elapsed: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """MJD and nanosecond of the day of `_unix_times`."""
    day = elapsed // DAY_NS
    return day + _UNIX_EPOCH_MJD, elapsed - day * DAY_NS


def _values(
    column: pl.Series, layout: RecordLayout, nominal: Fraction | None
) -> NDArray[np.float64]:
    if layout.value == "ratio" and nominal is not None:
        return fractional_from_decimals(column, nominal)
    return _fractional(column.to_numpy(), layout, nominal)


def _fractional(
    values: NDArray[np.float64], layout: RecordLayout, nominal: Fraction | None
) -> NDArray[np.float64]:
    """Offsets in Hz as parts of the carrier, a u of ratios as a part of the nominal."""
    if layout.value == "fractional" or nominal is None:
        return values
    return np.asarray(values / float(nominal))


def _allowed(column: pl.Series, layout: RecordLayout) -> NDArray[np.bool_]:
    """Rows whose flag is one of the stated ones, as text or as a number."""
    import polars as pl

    stated = {str(flag) for flag in layout.valid_flags}
    numbers = {number for flag in stated if (number := _number_or_none(flag)) is not None}
    if column.dtype != pl.String():
        flags = column.to_numpy()
        return np.asarray(np.any([flags == float(number) for number in numbers], axis=0))
    good = [
        text
        for text in column.unique().drop_nulls().to_list()
        if text in stated or _number_or_none(text) in numbers
    ]
    return np.asarray(column.is_in(good).fill_null(False).to_numpy())


def _number_or_none(text: str) -> Fraction | None:
    return Fraction(text) if NUMBER.fullmatch(text) else None


def _cells(
    read: Columns, unread: NDArray[np.bool_], timed: NDArray[np.bool_]
) -> Iterator[dict[str, Any]]:
    """Texts of the rows that did not parse, but for those that only lack a value: plain `nan`."""
    import polars as pl

    others = [name for name in read.frame.columns if name != "value"]
    complete = read.frame.select(pl.all_horizontal(pl.col(others).is_not_null()))[:, 0]
    texts = read.texts(unread)
    word = pl.col("value").str.strip_chars("+-").str.to_lowercase().fill_null("")
    whole = complete.gather(texts["row"]) & pl.Series(timed[unread])
    yield from texts.filter(~((word == "nan") & whole)).iter_rows(named=True)


@dataclass(frozen=True)
class _SecondLook:
    """Reads single rows as exact numbers into the columns, or tells why it cannot."""

    layout: RecordLayout
    nominal: Fraction | None
    tai: NDArray[np.int64]
    y: NDArray[np.float64]
    u: NDArray[np.float64] | None
    keep: NDArray[np.bool_]

    def row(self, cells: dict[str, Any], where: str, bad: BadRows) -> None:
        """Read one row; blank rows are passed over."""
        row = cells.pop("row")
        timed, self.keep[row] = bool(self.keep[row]), False
        if not any((text or "").strip() for text in cells.values()):
            return
        try:
            if not timed:
                self.tai[row] = self._time(cells["time"])
            self.y[row] = self._value(cells["value"], "value")
            if self.u is not None:
                self.u[row] = self._value(cells["u"], "u")
            if "flag" in cells and cells["flag"] is None:
                raise DataError("the flag is missing")
        except DataError as error:
            bad.add(where, str(error.args[0]).rstrip("."))
            return
        self.keep[row] = True

    def _time(self, text: str | None) -> int:
        text = (text or "").strip()
        if text.lower().strip("+-") in _NOT_FINITE:
            raise DataError("the time is not finite", value=text)
        if self.layout.time == "iso8601":
            return tai_from_iso(text)
        day, part = divmod(_number(text, "time"), 1)
        if not FIRST_MJD <= day <= LAST_MJD:
            raise DataError(IMPOSSIBLE_DAY, value=text)
        carried, rest = divmod(round(part * DAY_NS), DAY_NS)
        return int(tai_from_mjd_utc(day + carried, rest))

    def _value(self, text: str | None, column: str) -> float:
        text = (text or "").strip()
        if text.lower().strip("+-") == "nan":
            return math.nan
        number = _number(text, column)
        if self.nominal is not None and self.layout.value != "fractional":
            offset = self.nominal if (column, self.layout.value) == ("value", "ratio") else 0
            return float((number - offset) / self.nominal)
        return float(number)


def _number(text: str, column: str) -> Fraction:
    """Exact number of one cell."""
    if not text:
        raise DataError(f"the {column} is missing")
    if text.lower().strip("+-") in _NOT_FINITE:
        raise DataError(f"the {column} is not finite", value=text)
    if not NUMBER.fullmatch(text):
        raise DataError(f"the {column} is not a number", value=repr(text))
    return Fraction(text)
