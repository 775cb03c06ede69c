"""Writing the open exchange format: what is not changed stays as it is, byte by byte."""

from __future__ import annotations

import re
import shutil
from fractions import Fraction
from pathlib import Path

import numpy as np

from clockgeo.files import whole_file, write_text
from clockgeo.frequency.comparator import Comparator
from clockgeo.frequency.exchange import VALID_FLAG, ExchangeFolder, read_output
from clockgeo.frequency.record import Record
from clockgeo.times import DAY_NS, SECOND_NS, mjd_utc, tai_from_mjd_utc

__all__ = ["output_text", "write_exchange"]

_CELLS = re.compile(r"(^\s*|[\s,;]+)([^\s,;]+|$)")


def write_exchange(
    folder: ExchangeFolder,
    target: str | Path,
    *,
    outputs: dict[str, Record] | None = None,
    replace: bool = False,
) -> list[Path]:
    """Write a folder of the exchange format.

    Parameters
    ----------
    folder : ExchangeFolder
        Headers are written as they are, data files of comparators without a new output copied.
    target : path
        Folder to write to.
    outputs : dict of str to Record, optional
        New outputs of comparators, one file each.
    replace : bool
        Whether existing files may be replaced.

    Returns
    -------
    list of Path
    """
    target, written = Path(target), []
    target.mkdir(parents=True, exist_ok=True)
    for name, text in folder.headers:
        write_text(target / name, text, replace=replace)
        written.append(target / name)
    for name in folder.comparators:
        (target / name).mkdir(exist_ok=True)
        if outputs and name in outputs:
            for new, text in _new_files(folder, name, outputs[name]).items():
                write_text(target / name / new, text, replace=replace)
                written.append(target / name / new)
            continue
        for file in folder.data_files(name):
            path = target / name / file.name
            with whole_file(path, replace=replace) as partial:
                shutil.copyfile(file, partial)
            written.append(path)
    return written


def _new_files(folder: ExchangeFolder, name: str, record: Record) -> dict[str, str]:
    """Texts of a comparator's data files with a new output.

    Rows that the files have already keep their further columns; where the new output has other
    rows, it gets one file of its own.
    """
    comparator, files = folder.comparators[name], folder.data_files(name)
    if files:
        old = read_output(folder, name, experimental=True)
        if old.tick.size == record.tick.size and np.all(
            np.abs(old.tai_ns - record.tai_ns) < old.interval * SECOND_NS / 2.0
        ):
            return _with_new_values(files, comparator, record)
    return {f"{_first_day(record)}.dat": output_text(comparator, record)}


def _with_new_values(files: list[Path], comparator: Comparator, record: Record) -> dict[str, str]:
    """Change output and flag of each row, and leave everything else as it stands."""
    lag = comparator.lag * record.interval
    texts = {}
    for file in files:
        lines = file.read_text(encoding="utf-8").splitlines(keepends=True)
        for number, line in enumerate(lines):
            if line.strip() and not line.lstrip().startswith("#"):
                cells = _CELLS.findall(line)
                row = _row_at(cells[0][1], lag, record)
                cells[1] = (cells[1][0], _shown(record.y[row]))
                cells[2] = (cells[2][0], _flag(cells[2][1], usable=bool(record.usable[row])))
                lines[number] = "".join(f"{gap}{cell}" for gap, cell in cells)
        texts[file.name] = "".join(lines)
    return texts


def _row_at(mjd: str, lag: float, record: Record) -> int:
    """Place of the row whose gate a stamp belongs to."""
    whole, _, part = mjd.partition(".")
    nanosecond = round(Fraction(f"0.{part or 0}") * DAY_NS)
    start = int(tai_from_mjd_utc([int(whole)], [nanosecond])[0]) - round(lag * SECOND_NS)
    row = int(np.searchsorted(record.tai_ns, start - round(record.interval * SECOND_NS / 2.0)))
    return min(row, record.tai_ns.size - 1)


def _flag(old: str, *, usable: bool) -> str:
    """A row stays experimental where it was; one that may not be used is invalid."""
    if not usable:
        return "0"
    return old if int(old) else str(VALID_FLAG)


def _first_day(record: Record) -> int:
    return int(np.floor(mjd_utc(np.array([record.start]))[0]))


def output_text(comparator: Comparator, record: Record) -> str:
    """Text of a data file: MJD with six decimals, output, flag."""
    lag_ns = round(comparator.lag * record.interval * SECOND_NS)
    mjd = mjd_utc(record.tai_ns + lag_ns)
    lines = ["# MJD (UTC)\toutput\tflag"]
    for day, value, usable in zip(mjd, record.y, record.usable, strict=True):
        lines.append(f"{day:.6f}\t{_shown(value)}\t{VALID_FLAG if usable else 0}")
    return "\n".join(lines) + "\n"


def _shown(value: float) -> str:
    return f"{value:.12e}" if np.isfinite(value) else "nan"
