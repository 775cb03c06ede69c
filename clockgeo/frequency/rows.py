"""Rows of one file before they are put in order, and the tale of those that cannot be used."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError

__all__ = ["FIRST_MJD", "IMPOSSIBLE_DAY", "LAST_MJD", "BadRows", "Rows"]

FIRST_MJD, LAST_MJD = 41_317, 142_000
"""Days for which UTC is known: 1972 to 2247."""
IMPOSSIBLE_DAY = "the time lies outside the years 1972 to 2247"

_SHOWN = 5


@dataclass
class BadRows:
    """What is wrong with which rows; one message for all of them.

    Attributes
    ----------
    places : list of (str, str)
        Where (``"day1.txt, line 7"``) and what is wrong there.
    """

    places: list[tuple[str, str]] = field(default_factory=list)

    def add(self, where: str, problem: str) -> None:
        """Remember one bad row."""
        self.places.append((where, problem))

    def summary(self) -> str:
        """The first few, and how many more."""
        told = "; ".join(f"{where}: {problem}" for where, problem in self.places[:_SHOWN])
        more = len(self.places) - _SHOWN
        return told + (f"; and {more} more" if more > 0 else "")

    def settle(self, what: str, rows: int, *, skip: bool) -> str | None:
        """Raise for all bad rows at once, or say in a note that they were left out.

        Raises
        ------
        DataError
            If there are bad rows and `skip` is false.
        """
        if not self.places:
            return None
        count = f"{len(self.places)} of {rows} rows {what}"
        if skip:
            return f"{count} and were left out ({self.summary()})"
        raise DataError(
            count,
            value=self.summary(),
            advice="Mend the file, or leave these rows out with --skip-bad-rows",
        )


@dataclass(frozen=True, eq=False)
class Rows:
    """Columns of one file.

    Attributes
    ----------
    file : str
        The file, for messages.
    tai_ns : int64 array, shape (N,)
        Stamps as written.
    y : float64 array, shape (N,)
        Fractional frequency; NaN where there is none.
    usable : bool array, shape (N,)
        Finite value and a flag that allows it.
    u : float64 array, shape (N,), or None
        Standard uncertainty of each row.
    line : int64 array, shape (N,)
        Line in the file, or position in the variable, from 1.
    unit : str
        What that counts, for messages: ``"line"`` or ``"row"``.
    """

    file: str
    tai_ns: NDArray[np.int64]
    y: NDArray[np.float64]
    usable: NDArray[np.bool_]
    u: NDArray[np.float64] | None
    line: NDArray[np.int64]
    unit: str = "line"

    def place(self, row: int) -> str:
        """Where a row is, for messages."""
        return f"{self.file}, {self.unit} {self.line[row]}"

    def kept(self, keep: NDArray[np.bool_] | NDArray[np.int64]) -> Rows:
        """The rows of a mask or in the order of an index."""
        u = None if self.u is None else self.u[keep]
        columns = (self.tai_ns[keep], self.y[keep], self.usable[keep], u, self.line[keep])
        return Rows(self.file, *columns, unit=self.unit)

    def without_bad_values(self, bad: BadRows) -> Rows:
        """Leave out, and tell, rows with an infinite value or a u that is none."""
        infinite = np.isinf(self.y)
        wrong = infinite
        if self.u is not None:
            wrong = infinite | (self.usable & ~(self.u >= 0.0)) | np.isinf(self.u)
        if not np.any(wrong):
            return self
        for row in np.flatnonzero(wrong).tolist():
            problem = "the value is not finite" if infinite[row] else "u is not a number >= 0"
            bad.add(self.place(row), problem)
        return self.kept(~wrong)
