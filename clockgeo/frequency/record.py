"""A frequency record: fractional frequency on an integer time line, with what is usable."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries
from clockgeo.times import SECOND_NS

__all__ = ["Record", "Source"]


@dataclass(frozen=True)
class Source:
    """A file that a record was read from, with the checksum of its bytes as stored."""

    path: str
    sha256: str


@dataclass(frozen=True, eq=False)
class Record:
    """Fractional frequency at increasing epochs; immutable, gaps kept.

    Attributes
    ----------
    name : str
        What messages and reports call it.
    tai_ns : int64 array, shape (N,)
        Start of each averaging interval, ns of TAI since 1958, strictly increasing.
    y : float64 array, shape (N,)
        Fractional frequency, dimensionless; NaN where the row holds none.
    usable : bool array, shape (N,)
        Rows with a value whose flag, if there is one, says it may be used.
    interval : float
        Sampling interval in s, > 0.
    tick : int64 array, shape (N,)
        Row positions on the time line of `interval`, counted from the origin of TAI; strictly
        increasing. Records of the same interval share that line.
    u : float64 array, shape (N,), or None
        Standard uncertainty of each row as stated in the file.
    sources : tuple of Source
        The files it was read from.
    notes : tuple of str
        What reading found worth telling.
    doubts : tuple of str
        What must be looked at before anything is made of the record.
    weighting : "pi", "lambda" or None
        Weighting of the counter that averaged each row, where it is known.
    time_error : TickSeries or None
        Time errors in s that the frequencies are differences of, where such were recorded; ticks as
        those of the rows they start.
    """

    name: str
    tai_ns: NDArray[np.int64]
    y: NDArray[np.float64]
    usable: NDArray[np.bool_]
    interval: float
    tick: NDArray[np.int64]
    u: NDArray[np.float64] | None = None
    sources: tuple[Source, ...] = ()
    notes: tuple[str, ...] = ()
    weighting: Literal["pi", "lambda"] | None = None
    time_error: TickSeries | None = None
    doubts: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        columns = [self.tai_ns, self.y, self.usable, self.tick]
        if self.u is not None:
            columns.append(self.u)
        shapes = {np.shape(column) for column in columns}
        if len(shapes) != 1 or np.ndim(self.y) != 1 or np.size(self.y) == 0:
            raise DataError("a record needs columns of one length", value=shapes, where=self.name)
        if not (np.isfinite(self.interval) and self.interval > 0.0):
            raise DataError("the interval must be positive", value=self.interval, where=self.name)
        for label, column in (("epochs", self.tai_ns), ("ticks", self.tick)):
            if not np.all(column[1:] > column[:-1]):
                raise DataError(f"the {label} do not increase", where=self.name)
        if np.any(self.usable & ~np.isfinite(self.y)):
            raise DataError("a usable row holds no finite value", where=self.name)
        for label in ("tai_ns", "y", "usable", "tick", "u"):
            self._lock(label)

    def _lock(self, label: str) -> None:
        """Keep a read-only view, so that the record cannot change and its maker's array may."""
        column = getattr(self, label)
        if column is not None:
            view = column.view()
            view.flags.writeable = False
            object.__setattr__(self, label, view)

    def __len__(self) -> int:
        return int(self.y.size)

    @property
    def start(self) -> int:
        """Start of the first averaging interval, TAI ns."""
        return int(self.tai_ns[0])

    @property
    def stop(self) -> int:
        """End of the last averaging interval, TAI ns."""
        return int(self.tai_ns[-1]) + round(self.interval * SECOND_NS)

    @property
    def span(self) -> float:
        """Time from start to stop, s."""
        return (self.stop - self.start) / SECOND_NS

    @property
    def valid_seconds(self) -> float:
        """Total time of the usable rows, s."""
        return float(np.count_nonzero(self.usable) * self.interval)

    @property
    def uptime(self) -> float:
        """Usable part of the span on the time line, 0 to 1."""
        ticks = int(self.tick[-1] - self.tick[0]) + 1
        return float(np.count_nonzero(self.usable) / ticks)

    def valid(self) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
        """Ticks and values of the usable rows, in time order."""
        return self.tick[self.usable], self.y[self.usable]

    def on_grid(self) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
        """Lay the record on its gap-filled time line.

        Returns
        -------
        y : float64 array, shape (tick[-1] - tick[0] + 1,)
            Fractional frequency; NaN where there is no usable row.
        valid : bool array, same shape
            Where y is usable.
        """
        places = self.tick[self.usable] - self.tick[0]
        y = np.full(int(self.tick[-1] - self.tick[0]) + 1, np.nan)
        y[places] = self.y[self.usable]
        return y, ~np.isnan(y)
