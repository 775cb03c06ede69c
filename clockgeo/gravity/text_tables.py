"""Small tables in text files: comma separated, named columns, `#` comments, units in the names."""

from __future__ import annotations

import csv
import math
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TypeVar

from clockgeo.errors import DataError

__all__ = ["number", "read_rows"]

T = TypeVar("T")
Row = dict[str, str]


def read_rows(
    path: str | Path,
    convert: Callable[[Row], T],
    *,
    required: Sequence[str],
    optional: Sequence[str] = (),
) -> list[T]:
    """Read a table row by row; every bad row is told at once.

    Parameters
    ----------
    path : path
        UTF-8 text; the first line that is neither blank nor a comment names the columns.
    convert : callable
        Makes one item from one row; raises DataError on what it cannot use.
    required, optional : sequence of str
        Column names that must or may be there; others are refused.

    Raises
    ------
    DataError
        If the file is no such table or rows are bad; names the file, the lines and the fields.
    """
    name = Path(path).name
    lines = _content(Path(path))
    if not lines:
        raise DataError("the table is empty", where=name, allowed=_layout(required, optional))
    header = [column.strip() for column in next(csv.reader([lines[0][1]]))]
    _check_header(header, required, optional, f"{name}, line {lines[0][0]}")
    items, problems = [], []
    for number_of_line, text in lines[1:]:
        cells = [cell.strip() for cell in next(csv.reader([text]))]
        try:
            if len(cells) != len(header):
                raise DataError(f"{len(cells)} fields instead of {len(header)}")
            items.append(convert(dict(zip(header, cells, strict=True))))
        except DataError as error:
            problems.append(f"line {number_of_line}: {str(error).rstrip('.')}")
    if problems:
        shown = "; ".join(problems[:5])
        raise DataError(
            f"{len(problems)} of {len(lines) - 1} rows are bad", value=shown, where=name
        )
    if not items:
        raise DataError("the table has a header but no rows", where=name)
    return items


def number(row: Row, column: str) -> float:
    """Finite number in a column of a row.

    Raises
    ------
    DataError
        If the text is no finite number; names the column.
    """
    text = row[column]
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise DataError(f"{column} is not a finite number", value=repr(text))
    return value


def _content(path: Path) -> list[tuple[int, str]]:
    """Lines that are neither blank nor comments, with their numbers."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise DataError(
            "not a text file", where=path.name, allowed="A CSV table in UTF-8"
        ) from None
    numbered = enumerate(text.splitlines(), start=1)
    return [(n, line) for n, line in numbered if line.strip() and not line.lstrip().startswith("#")]


def _check_header(
    header: list[str], required: Sequence[str], optional: Sequence[str], where: str
) -> None:
    missing = [column for column in required if column not in header]
    unknown = [column for column in header if column not in (*required, *optional)]
    repeated = sorted({column for column in header if header.count(column) > 1})
    for what, columns in (("missing", missing), ("unknown", unknown), ("repeated", repeated)):
        if columns:
            raise DataError(
                f"{what} column{'s' if len(columns) > 1 else ''}",
                value=", ".join(columns),
                where=where,
                allowed=_layout(required, optional),
            )


def _layout(required: Sequence[str], optional: Sequence[str]) -> str:
    extra = f"; may have {', '.join(optional)}" if optional else ""
    return f"Columns {', '.join(required)}{extra}"
