"""Write a frequency record as its layout says: text, gzip'd text, or CF netCDF."""

from __future__ import annotations

import gzip
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError
from clockgeo.files import whole_file
from clockgeo.frequency.layout import Column, RecordLayout
from clockgeo.frequency.ratio import ratio_text
from clockgeo.frequency.sampling import estimate_interval
from clockgeo.times import DAY_NS, SECOND_NS, iso_utc, mjd_utc_parts

if TYPE_CHECKING:
    import polars as pl

__all__ = ["time_texts", "write_record"]

_MJD_EXACT = 14
"""Decimals of an MJD that resolve a nanosecond."""
_UNIX_EPOCH_MJD = 40_587
_FILLER = "nan"


def write_record(
    path: str | Path,
    tai_ns: ArrayLike,
    y: ArrayLike,
    *,
    layout: RecordLayout,
    nominal_ratio: Fraction | None = None,
    carrier: Fraction | None = None,
    usable: ArrayLike | None = None,
    u: ArrayLike | None = None,
    stamp_decimals: int | None = None,
    ratio_digits: int = 22,
    replace: bool = False,
) -> None:
    """Write rows so that `read_record` with the same layout gives them back.

    Parameters
    ----------
    path : path
        The file; ``.gz`` compresses, ``.nc`` (or the layout's format) is netCDF.
    tai_ns : integer array, shape (N,)
        Start of each averaging interval, TAI ns.
    y : float array, shape (N,)
        Fractional frequency; NaN is written as ``nan``.
    layout : RecordLayout
        Columns, kind of time and value, stamped instant. Its `file` is not used.
    nominal_ratio : Fraction, optional
        Exact nominal ratio; needed for full ratios.
    carrier : Fraction, optional
        Optical frequency in Hz; needed for offsets.
    usable : bool array, shape (N,), optional
        What the flag column says; where y is finite, if not given.
    u : float array, shape (N,), optional
        Standard uncertainty of each row; needed if the layout has a column for it.
    stamp_decimals : int, optional
        Decimals of the MJD in days, or of ISO 8601 seconds; 6 imitates published records. Enough
        for every nanosecond if not given.
    ratio_digits : int
        Significant digits of full ratios.
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    DataError
        If columns do not fit together, a value is infinite, or what values refer to is not given.
    OutputError
        If the file exists or cannot be written.

    Notes
    -----
    Fractional values are written with the digits that give the same float64 back, ratios exactly
    rounded to `ratio_digits`, offsets to within one unit of the last place of a float64. Equal
    input gives equal bytes.
    """
    stamps = np.atleast_1d(np.asarray(tai_ns, dtype=np.int64))
    values = np.atleast_1d(np.asarray(y, dtype=np.float64))
    if stamps.shape != values.shape or stamps.ndim != 1 or not stamps.size:
        shapes = f"{stamps.shape} and {values.shape}"
        raise DataError("times and values need one common length, at least 1", value=shapes)
    if layout.value == "time_error":
        raise DataError(
            "time errors are read, not written",
            value=str(path),
            advice="Write fractional frequencies, or state value = 'fractional' for this record",
        )
    if np.any(np.isinf(values)):
        raise DataError("a fractional frequency is infinite", allowed="Finite values, or NaN")
    flags = np.isfinite(values) if usable is None else np.asarray(usable, dtype=bool)
    columns: dict[str, Any] = {
        "time": _stamped(stamps, layout),
        "value": _values(values, layout, nominal_ratio, carrier, ratio_digits),
    }
    if layout.flag_column is not None:
        columns["flag"] = flags & np.isfinite(values)
    if layout.u_column is not None:
        if u is None:
            raise DataError("the layout has a column for u, but no u is given")
        reference = {"ratio": nominal_ratio, "offset": carrier}.get(layout.value)
        columns["u"] = np.asarray(u, dtype=np.float64) * float(reference or 1)
    if any(np.shape(column) != stamps.shape for column in columns.values()):
        raise DataError("all columns need one common length", value=stamps.size)
    target = Path(path)
    kind = layout.format or ("netcdf" if target.suffix.lower() in {".nc", ".nc4"} else "text")
    with whole_file(target, replace=replace) as partial:
        if kind == "netcdf":
            from clockgeo.frequency.netcdf_writing import write_netcdf

            write_netcdf(partial, columns, layout)
        else:
            content = _text(columns, layout, stamp_decimals)
            if target.suffix.lower() == ".gz":
                content = gzip.compress(content, compresslevel=6, mtime=0)
            partial.write_bytes(content)


def _stamped(tai_ns: NDArray[np.int64], layout: RecordLayout) -> NDArray[np.int64]:
    """The instant of each averaging interval that the layout stamps."""
    shift = {"start": 0.0, "middle": 0.5, "end": 1.0}[layout.stamp]
    if not shift:
        return tai_ns
    interval = layout.interval if layout.interval is not None else estimate_interval(tai_ns)
    return tai_ns + round(shift * interval * SECOND_NS)


def _values(
    y: NDArray[np.float64],
    layout: RecordLayout,
    nominal_ratio: Fraction | None,
    carrier: Fraction | None,
    ratio_digits: int,
) -> NDArray[Any]:
    """Texts of ratios, or numbers."""
    if layout.value == "ratio":
        if nominal_ratio is None:
            raise DataError("full ratios need the nominal ratio")
        return np.array(ratio_text(y, nominal_ratio, digits=ratio_digits), dtype=object)
    if layout.value == "offset":
        if carrier is None:
            raise DataError("offsets in Hz need the optical frequency they belong to")
        return np.asarray(y * float(carrier))
    return y


def _text(columns: dict[str, Any], layout: RecordLayout, stamp_decimals: int | None) -> bytes:
    """Rows separated by tabs, with a header line if the layout names columns."""
    import polars as pl

    texts = {
        "time": time_texts(columns["time"], kind=layout.time, decimals=stamp_decimals),
        "value": _number_texts(columns["value"]),
    }
    if "flag" in columns:
        good, other = str(layout.valid_flags[0]), _other_flag(layout)
        texts["flag"] = pl.Series(np.where(columns["flag"], good, other))
    if "u" in columns:
        texts["u"] = _number_texts(columns["u"])
    order, header = _order(layout, list(texts))
    filler = pl.lit(_FILLER)
    frame = pl.DataFrame(texts).select(
        (pl.col(role) if role in texts else filler).alias(f"{position}")
        for position, role in enumerate(order)
    )
    rows = frame.write_csv(separator="\t", include_header=False, quote_style="never")
    return (header + rows).encode()


def _number_texts(values: NDArray[Any]) -> pl.Series:
    """Shortest texts that give the same float64 back; texts as they are."""
    import polars as pl

    if values.dtype == object:
        return pl.Series(values.tolist(), dtype=pl.String)
    column = pl.Series(values)
    return column.cast(pl.String).str.replace("NaN", "nan", literal=True)


def _other_flag(layout: RecordLayout) -> str:
    """A flag that does not mean valid."""
    taken = {str(flag) for flag in layout.valid_flags}
    return next(str(flag) for flag in range(len(taken) + 1) if str(flag) not in taken)


def _order(layout: RecordLayout, roles: list[str]) -> tuple[list[str], str]:
    """Role of every column from left to right, and the header line."""
    stated: dict[str, Column] = {role: getattr(layout, f"{role}_column") for role in roles}
    numbered = {role: column for role, column in stated.items() if isinstance(column, int)}
    if len(set(stated.values())) != len(stated):
        raise DataError("two columns of the layout are the same", value=stated)
    places = {column: role for role, column in numbered.items()}
    position = 1
    for role in roles:
        if role in numbered:
            continue
        while position in places:
            position += 1
        places[position] = role
    order = [places.get(at, "") for at in range(1, max(places) + 1)]
    if len(numbered) == len(roles):
        return order, ""
    words = [str(stated[role]) if role and role not in numbered else role or "-" for role in order]
    return order, "\t".join(words) + "\n"


def time_texts(tai_ns: NDArray[np.int64], *, kind: str, decimals: int | None) -> pl.Series:
    """Write instants as MJD (UTC) or ISO 8601 (UTC).

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        TAI ns.
    kind : str
        ``"mjd"`` or ``"iso8601"``.
    decimals : int or None
        Decimals of the day (MJD, 0 to 15) or of the second (ISO 8601, 0 to 9); None for every ns.

    Returns
    -------
    polars Series of str
        Rounded half up. An MJD has no name for an instant within a leap second; the end of the
        day is written.

    Raises
    ------
    DataError
        If there are too many decimals.
    """
    most = 15 if kind == "mjd" else 9
    exact = _MJD_EXACT if kind == "mjd" else 9
    places = exact if decimals is None else decimals
    if not 0 <= places <= most:
        raise DataError("cannot write so many decimals", value=places, allowed=f"0 to {most}")
    return _mjd_texts(tai_ns, places) if kind == "mjd" else _iso_texts(tai_ns, places)


def _mjd_texts(tai_ns: NDArray[np.int64], places: int) -> pl.Series:
    day, rest = mjd_utc_parts(tai_ns)
    rest = np.minimum(rest, DAY_NS - 1)
    # One day is 864e11 ns: 10^places steps a day are 864 10^(11 - places) ns each.
    power = 11 - places
    scale, width = (1, 864 * 10**power) if power >= 0 else (10**-power, 864)
    steps = (rest * scale + width // 2) // width
    carried, steps = np.divmod(steps, 10**places)
    return _joined(day + carried, ".", steps, places)


def _iso_texts(tai_ns: NDArray[np.int64], places: int) -> pl.Series:
    import polars as pl

    step = 10 ** (9 - places)
    rounded = (tai_ns + step // 2) // step * step
    day, rest = mjd_utc_parts(rounded)
    second, fraction = np.divmod((day - _UNIX_EPOCH_MJD) * DAY_NS + rest, SECOND_NS)
    dates = pl.from_epoch(pl.Series(second), time_unit="s").dt.strftime("%Y-%m-%dT%H:%M:%S")
    texts = _joined(dates, ".", fraction // step, places) + "Z"
    leap = np.flatnonzero(rest >= DAY_NS)
    if leap.size:
        written = texts.to_list()
        for row in leap.tolist():
            written[row] = iso_utc(int(rounded[row]), digits=places)
        texts = pl.Series(written)
    return texts


def _joined(whole: Any, mark: str, steps: NDArray[np.int64], places: int) -> pl.Series:
    """Text of whole numbers or dates and of a fraction with a fixed number of digits."""
    import polars as pl

    texts = pl.Series("whole", whole).cast(pl.String)
    if not places:
        return texts
    return texts + mark + pl.Series(steps).cast(pl.String).str.zfill(places)
