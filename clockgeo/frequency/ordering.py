"""Rows of several files in one time order, each stamp once."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.rows import BadRows, Rows

__all__ = ["in_order"]


def in_order(tables: Sequence[Rows], *, skip_bad_rows: bool) -> tuple[Rows, list[str | None]]:
    """Sort rows by time and merge stamps that occur twice.

    Parameters
    ----------
    tables : sequence of Rows
        The files' rows, in any order.
    skip_bad_rows : bool
        Leave out stamps with contradicting rows rather than raise.

    Returns
    -------
    rows : Rows
        Strictly increasing in time.
    notes : list of str
        What was sorted, merged or left out.

    Raises
    ------
    DataError
        If there is no row at all, or rows of the same time contradict each other.
    """
    filled = sorted((table for table in tables if table.y.size), key=lambda t: int(t.tai_ns.min()))
    if not filled:
        raise DataError("the files hold no usable row", value=", ".join(t.file for t in tables))
    rows = filled[0] if len(filled) == 1 else _joined(filled)
    notes: list[str | None] = []
    if np.all(rows.tai_ns[1:] > rows.tai_ns[:-1]):
        return rows, notes
    steps = np.diff(rows.tai_ns)
    files = _files(filled)
    if steps.min() < 0:
        early = int(np.count_nonzero(steps < 0))
        notes.append(f"rows were out of order in {early} places and were sorted by time")
        order = np.argsort(rows.tai_ns, kind="stable")
        rows = rows.kept(order)
        files = files[order]
    rows, repeated, contradictions = _merged(rows, files, [table.file for table in filled])
    if repeated:
        notes.append(f"{repeated} rows repeat the row of the same time and were left out")
    if contradictions.places:
        notes.append(_contradicted(contradictions, rows, skip=skip_bad_rows))
    return rows, notes


def _joined(tables: Sequence[Rows]) -> Rows:
    u = None
    if tables[0].u is not None:
        u = np.concatenate([table.u for table in tables if table.u is not None])
    return Rows(
        file=tables[0].file,
        tai_ns=np.concatenate([table.tai_ns for table in tables]),
        y=np.concatenate([table.y for table in tables]),
        usable=np.concatenate([table.usable for table in tables]),
        u=u,
        line=np.concatenate([table.line for table in tables]),
        unit=tables[0].unit,
    )


def _files(tables: Sequence[Rows]) -> NDArray[np.int64]:
    """Position of each row's file."""
    return np.repeat(np.arange(len(tables)), [table.y.size for table in tables])


def _merged(
    rows: Rows, files: NDArray[np.int64], names: Sequence[str]
) -> tuple[Rows, int, BadRows]:
    """First row of every stamp; how many rows repeat it; stamps whose rows differ, left out."""
    same_time = np.diff(rows.tai_ns) == 0
    differs = same_time & ~_same(rows)
    stamp = np.append(0, np.cumsum(~same_time))
    contradicted = np.zeros(stamp[-1] + 1, dtype=bool)
    contradicted[stamp[1:][differs]] = True
    contradictions = BadRows()
    for which in np.flatnonzero(contradicted).tolist():
        members = range(*np.searchsorted(stamp, [which, which + 1]).tolist())
        lines = " and ".join(
            f"{names[files[row]]}, {rows.unit} {rows.line[row]}" for row in members
        )
        values = " and ".join(f"{rows.y[row]:.6g}" for row in members)
        contradictions.add(lines, f"values {values} at the same time")
    first = np.append(True, ~same_time)
    repeated = int(np.count_nonzero(~first & ~contradicted[stamp]))
    return rows.kept(first & ~contradicted[stamp]), repeated, contradictions


def _same(rows: Rows) -> NDArray[np.bool_]:
    """Whether each row says the same as the one before it."""
    same = (rows.y[1:] == rows.y[:-1]) | (np.isnan(rows.y[1:]) & np.isnan(rows.y[:-1]))
    same &= rows.usable[1:] == rows.usable[:-1]
    if rows.u is not None:
        same &= (rows.u[1:] == rows.u[:-1]) | (np.isnan(rows.u[1:]) & np.isnan(rows.u[:-1]))
    return np.asarray(same)


def _contradicted(contradictions: BadRows, rows: Rows, *, skip: bool) -> str:
    count = len(contradictions.places)
    if not skip:
        raise DataError(
            f"{count} times have rows that contradict each other",
            value=contradictions.summary(),
            advice="Mend the files, leave these times out with --skip-bad-rows, or write times "
            "with more digits if they are rounded to more than the sampling interval",
        )
    if not rows.y.size:
        raise DataError("every time has rows that contradict each other")
    return f"{count} times have contradicting rows and were left out ({contradictions.summary()})"
