"""Tables of a page: what is read, and the same as CSV with units in its header."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass, field

from clockgeo.report.numbers import ABSENT, typeset, with_uncertainty

__all__ = ["Cell", "Sheet", "count", "measured", "plain", "words"]

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")


@dataclass(frozen=True)
class Cell:
    """One cell: what people read, and the bare values that stand for it in CSV.

    Attributes
    ----------
    text : str
        Shown on the page.
    values : tuple of (str, int, float or None)
        One or two CSV fields (a value and its u).
    is_number : bool
        Aligned right.
    """

    text: str
    values: tuple[str | int | float | None, ...]
    is_number: bool = True


def words(text: str) -> Cell:
    """A cell of text."""
    return Cell(text, (text,), is_number=False)


def count(number: int) -> Cell:
    """A cell with a whole number."""
    return Cell(str(number), (number,))


def measured(value: float | None, u: float | None, *, step: float = 1.0) -> Cell:
    """A value with its u, shown in units of `step`; CSV has both in SI."""
    from clockgeo.report.numbers import in_units_of

    shown = with_uncertainty(value, u) if step == 1.0 else in_units_of(value, step, u)
    return Cell(typeset(shown), (value, u))


def plain(text: str, value: float | str | None) -> Cell:
    """A number written as `text` that stands in CSV as `value`."""
    return Cell(typeset(text) if value is not None else ABSENT, (value,))


@dataclass(frozen=True)
class Sheet:
    """A table with its caption.

    Attributes
    ----------
    id : str
        Letters and hyphens; unique on the page.
    caption : str
    columns : tuple of str
        Headers with units, as read.
    names : tuple of str
        Headers of the CSV fields, with units; a measured column has two.
    rows : tuple of tuple of Cell
        The first cell of a row names it.
    heads : int
        How many first cells of a row name it.
    """

    id: str
    caption: str
    columns: tuple[str, ...]
    names: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...] = field(default=())
    heads: int = 1

    @classmethod
    def of(
        cls,
        id: str,  # noqa: A002
        caption: str,
        columns: Sequence[tuple[str, str | tuple[str, str]]],
        rows: Sequence[Sequence[Cell]],
        *,
        heads: int = 1,
    ) -> Sheet:
        """Make a sheet from (header, CSV name or names) pairs and rows."""
        names = [part for _, csv_name in columns for part in _as_tuple(csv_name)]
        return cls(
            id=id,
            caption=caption,
            columns=tuple(header for header, _ in columns),
            names=tuple(names),
            rows=tuple(tuple(row) for row in rows),
            heads=heads,
        )

    def is_number(self, column: int) -> bool:
        """Whether a column holds numbers, by its first row."""
        return bool(self.rows) and self.rows[0][column].is_number

    @property
    def csv(self) -> str:
        """The table as CSV: header with units, full precision, empty where there is no number.

        Text that a spreadsheet would take for a formula gets an apostrophe in front.
        """
        stream = io.StringIO()
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(self.names)
        for row in self.rows:
            writer.writerow([_field(value) for cell in row for value in cell.values])
        return stream.getvalue()


def _as_tuple(name: str | tuple[str, str]) -> tuple[str, ...]:
    return (name,) if isinstance(name, str) else name


def _field(value: str | float | None) -> str:
    if value is None:
        return ""
    if isinstance(value, str):
        return f"'{value}" if value.startswith(_FORMULA_STARTS) else value
    return repr(value)
