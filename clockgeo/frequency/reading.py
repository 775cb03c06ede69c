"""Read a frequency record: several files of one layout become one `Record` on one time line."""

from __future__ import annotations

import glob
import hashlib
import mmap
from concurrent.futures import ThreadPoolExecutor
from fractions import Fraction
from pathlib import Path

import numpy as np

from clockgeo.errors import DataError
from clockgeo.frequency.layout import RecordLayout
from clockgeo.frequency.ordering import in_order
from clockgeo.frequency.record import Record, Source
from clockgeo.frequency.rows import BadRows, Rows
from clockgeo.frequency.sampling import Sampling, sample_ticks
from clockgeo.frequency.time_error import frequency_of_time_errors
from clockgeo.times import SECOND_NS, iso_utc

__all__ = ["read_record"]

_LARGEST_TYPICAL_Y = 1e-6
_ENOUGH_ROWS = 20_000
_LARGEST_MISFIT = 1e-3
"""Relative difference of a stated interval from the rows' that is worth a note."""


def read_record(
    layout: RecordLayout,
    *,
    base: Path,
    name: str,
    nominal_ratio: Fraction | None = None,
    carrier: Fraction | None = None,
    skip_bad_rows: bool = False,
    latest_ns: int | None = None,
) -> Record:
    """Read the files of a layout and put their rows on one time line.

    Rows out of order are sorted and repeated rows that agree are merged, both with a note; a
    `nan` is a row without a value. Everything else that is odd is an error naming all its lines.

    Parameters
    ----------
    layout : RecordLayout
        Files and columns, as stated by the user.
    base : Path
        Folder that file names are relative to.
    name : str
        What messages and reports call the record.
    nominal_ratio : Fraction, optional
        Exact nominal ratio; needed for values that are full ratios.
    carrier : Fraction, optional
        Optical frequency in Hz; needed for values that are offsets in Hz.
    skip_bad_rows : bool
        Leave rows out that cannot be used, and say so in the notes, rather than refuse the record.
    latest_ns : int, optional
        TAI ns after which a stamp is taken for a mistake.

    Returns
    -------
    Record
        Stamps moved to the start of their averaging intervals, values as fractional frequency.

    Raises
    ------
    DataError
        If a file is missing, empty, binary or damaged, a column is missing, rows cannot be read,
        have no finite time, or contradict each other, the values do not fit the nominal ratio or
        the carrier, or no row is usable.
    """
    nominal = _reference(layout, nominal_ratio, carrier, name)
    bad = BadRows()
    sources: list[Source] = []
    tables: list[Rows] = []
    with ThreadPoolExecutor(max_workers=1) as aside:
        for path, shown in _paths(layout, base, name):
            content = _content(path, shown)
            digest = aside.submit(hashlib.sha256, content)
            rows = _rows(path, content, layout, nominal, shown, bad)
            tables.append(rows.without_bad_values(bad))
            sources.append(Source(shown, digest.result().hexdigest()))
    read = sum(table.y.size for table in tables) + len(bad.places)
    notes = [bad.settle("cannot be used", read, skip=skip_bad_rows)]
    rows, ordering = in_order(tables, skip_bad_rows=skip_bad_rows)
    _check_rows(rows, name, latest_ns)
    sampling = sample_ticks(rows.tai_ns, interval=layout.interval)
    shift = {"start": 0.0, "middle": 0.5, "end": 1.0}[layout.stamp]
    record = Record(
        name=name,
        tai_ns=rows.tai_ns - round(shift * sampling.interval * SECOND_NS),
        y=rows.y,
        usable=rows.usable,
        interval=sampling.interval,
        tick=sampling.tick,
        u=rows.u,
        sources=tuple(sources),
        notes=tuple(note for note in [*notes, *ordering, *_about(sampling)] if note),
        weighting=layout.weighting,
    )
    if layout.value == "time_error":
        record = frequency_of_time_errors(record)
    _refuse_far_values(record, layout)
    return record


def _reference(
    layout: RecordLayout, nominal_ratio: Fraction | None, carrier: Fraction | None, name: str
) -> Fraction | None:
    """What values are referred to: the nominal ratio, the carrier, or nothing."""
    if layout.value == "ratio" and nominal_ratio is None:
        raise DataError(
            "full ratios need the nominal ratio they are compared with",
            where=name,
            advice="State the two transitions, or the nominal ratio as decimal text",
        )
    if layout.value == "offset" and carrier is None:
        raise DataError(
            "offsets in Hz need the optical frequency they belong to",
            where=name,
            advice="Name the carrier's transition, or give its frequency in Hz as decimal text",
        )
    reference = {"ratio": nominal_ratio, "offset": carrier}.get(layout.value)
    if reference is not None and reference <= 0:
        raise DataError("a nominal value must be positive", value=str(reference), where=name)
    return reference


def _paths(layout: RecordLayout, base: Path, name: str) -> list[tuple[Path, str]]:
    """The files that exist, each once, with the name to show for them."""
    found: dict[Path, str] = {}
    for pattern in layout.files:
        if glob.has_magic(pattern) and not (base / pattern).is_file():
            matches = sorted(glob.glob(pattern, root_dir=base))  # noqa: PTH207  (absolute patterns too)
            if not matches:
                raise DataError("no file fits the pattern", value=pattern, where=name)
        else:
            matches = [pattern]
        for match in matches:
            if not (base / match).is_file():
                raise DataError(
                    "the record's file does not exist"
                    if not (base / match).exists()
                    else "the record's file is a folder",
                    value=match,
                    where=name,
                    advice="File names are relative to the folder of the campaign document",
                )
            found.setdefault((base / match).resolve(), match)
    return list(found.items())


def _content(path: Path, shown: str) -> bytes | mmap.mmap:
    """The bytes of a file, mapped rather than copied; an empty file cannot be mapped."""
    try:
        with path.open("rb") as stream:
            if not path.stat().st_size:
                return b""
            return mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ)
    except OSError as error:
        raise DataError(f"cannot read the file ({error.strerror})", value=shown) from error


def _rows(
    path: Path,
    content: bytes | mmap.mmap,
    layout: RecordLayout,
    nominal: Fraction | None,
    shown: str,
    bad: BadRows,
) -> Rows:
    kind = layout.format or ("netcdf" if path.suffix.lower() in {".nc", ".nc4"} else "text")
    if kind == "netcdf":
        from clockgeo.frequency.netcdf_rows import netcdf_rows

        return netcdf_rows(path, layout, nominal=nominal, where=shown, bad=bad)
    from clockgeo.frequency.text_rows import text_rows

    return text_rows(path, content, layout, nominal=nominal, where=shown, bad=bad)


def _check_rows(rows: Rows, name: str, latest_ns: int | None) -> None:
    """Refuse records without a usable value, or from the future."""
    if not np.any(rows.usable):
        raise DataError(
            "no row is usable: every value is nan or flagged",
            value=f"{rows.y.size} rows",
            where=name,
            advice="Check value_column, and flag_column with valid_flags",
        )
    if latest_ns is not None and rows.tai_ns[-1] > latest_ns:
        late = int(np.count_nonzero(rows.tai_ns > latest_ns))
        raise DataError(
            f"{late} of {rows.y.size} stamps lie in the future",
            value=iso_utc(int(rows.tai_ns[-1])),
            where=name,
            allowed=f"Stamps up to {iso_utc(latest_ns)}",
            advice="Check which column holds the time, and its unit",
        )


def _refuse_far_values(record: Record, layout: RecordLayout) -> None:
    usable = record.y[record.usable]
    typical = float(np.median(np.abs(usable[:: usable.size // _ENOUGH_ROWS + 1])))
    if typical > _LARGEST_TYPICAL_Y:
        raise DataError(
            "the values are far from what they should be close to",
            value=f"typical fractional frequency {typical:.3g}",
            where=record.name,
            allowed=f"Typical values up to {_LARGEST_TYPICAL_Y:g}",
            advice={
                "ratio": "Check the nominal ratio: is it the right pair, and the right way up?",
                "offset": "Check the carrier, and that the column holds its offset in Hz",
                "fractional": "Check value_column, and whether it holds ratios or offsets in Hz",
                "time_error": "Check value_column, and that it holds time errors in s",
            }[layout.value],
        )


def _about(sampling: Sampling) -> list[str]:
    """What is worth telling about the stamps."""
    notes = []
    if sampling.restarts:
        notes.append(
            f"{sampling.restarts} times the stamps go on off the grid of {sampling.interval:g} s; "
            "rows are placed on the nearest tick"
        )
    wandering = sampling.wander > sampling.interval
    if wandering and abs(sampling.step / sampling.interval - 1.0) > _LARGEST_MISFIT:
        notes.append(
            f"the rows come every {sampling.step:.6g} s on average, not every "
            f"{sampling.interval:g} s as stated; ticks follow the rows, times of averaging do not"
        )
    elif wandering:
        notes.append(
            f"the stamps wander by {sampling.wander:.3g} s against a rigid grid of "
            f"{sampling.interval:g} s; ticks follow the rows"
        )
    return notes
