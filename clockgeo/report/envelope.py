"""Long records made drawable: lowest and highest value of each pixel column."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.times import mjd_utc

__all__ = ["Columns", "days_utc", "envelope", "stretches"]

_UNIX_EPOCH_MJD = 40_587.0


@dataclass(frozen=True, eq=False)
class Columns:
    """What is drawn of a record; empty columns are left out.

    Attributes
    ----------
    tai_ns : int64 array, shape (M,)
        First epoch in each column.
    low, high : float array, shape (M,)
        Lowest and highest value in it.
    column : int array, shape (M,)
        Which column, increasing.
    """

    tai_ns: NDArray[np.int64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]
    column: NDArray[np.int64]


def days_utc(tai_ns: NDArray[np.int64]) -> NDArray[np.float64]:
    """Days since 1970-01-01 UTC, the unit of time axes."""
    return np.asarray(mjd_utc(tai_ns) - _UNIX_EPOCH_MJD)


def envelope(
    tai_ns: NDArray[np.int64], y: NDArray[np.float64], start: int, stop: int, columns: int = 900
) -> Columns:
    """Lowest and highest value in each of `columns` equal parts of the time from start to stop.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Increasing epochs within start and stop.
    y : float array, shape (N,)
        Finite values.
    start, stop : int
        Ends of the picture in TAI nanoseconds.
    columns : int
        Number of parts.
    """
    edges = start + np.arange(1, columns, dtype=np.float64) * ((stop - start) / columns)
    splits = np.searchsorted(tai_ns, edges.astype(np.int64), side="left")
    firsts = np.concatenate([[0], splits])
    filled = np.diff(np.append(firsts, tai_ns.size)) > 0
    firsts = firsts[filled]
    if not firsts.size:
        none = np.zeros(0)
        return Columns(np.zeros(0, np.int64), none, none, np.zeros(0, np.int64))
    return Columns(
        tai_ns=tai_ns[firsts],
        low=np.minimum.reduceat(y, firsts),
        high=np.maximum.reduceat(y, firsts),
        column=np.flatnonzero(filled),
    )


def stretches(
    tai_ns: NDArray[np.int64], interval: float, *, bridging: float
) -> list[tuple[int, int]]:
    """Start and stop of stretches of data; gaps shorter than `bridging` seconds are drawn over."""
    if not tai_ns.size:
        return []
    breaks = np.flatnonzero(np.diff(tai_ns) > 1e9 * (interval + bridging))
    firsts = np.concatenate([[0], breaks + 1])
    lasts = np.append(breaks, tai_ns.size - 1)
    length = round(1e9 * interval)
    return [
        (int(tai_ns[first]), int(tai_ns[last]) + length)
        for first, last in zip(firsts, lasts, strict=True)
    ]
