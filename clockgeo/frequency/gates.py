"""Outputs of several comparators on one integer line of gates."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.record import Record
from clockgeo.times import SECOND_NS

__all__ = ["GateLine", "gate_line"]

_SLACK = 0.2
"""Largest distance of a gate from the common grid, in gates."""
_ENOUGH = 20_000
"""Rows whose stamps are held against the grid; reading has put all rows on one line before."""


@dataclass(frozen=True, eq=False)
class GateLine:
    """One line of gates and the places of the outputs on it.

    Attributes
    ----------
    interval : float
        Gate time in s.
    phase : int
        Where the gates lie on the line of the interval, ns of TAI.
    first : int
        Tick of the first gate of any output.
    size : int
        Gates from the first to the last.
    places : dict of str to int64 array
        Gate of each usable row, counted from `first`; each at most once.
    """

    interval: float
    phase: int
    first: int
    size: int
    places: dict[str, NDArray[np.int64]]

    def starts(self, places: NDArray[np.int64]) -> NDArray[np.int64]:
        """Start of gates in ns of TAI."""
        return (places + self.first) * round(self.interval * SECOND_NS) + self.phase


def gate_line(outputs: Mapping[str, Record]) -> GateLine:
    """Put outputs on one line; stamps are snapped to its gates.

    Raises
    ------
    DataError
        If intervals differ, or gates do not lie on one grid.
    """
    interval = _common_interval(outputs)
    phase = _phase(next(iter(outputs.values())), interval)
    moved = {name: _moved(record, interval, phase) for name, record in outputs.items()}
    first = min(int(record.tick[0]) + moved[name] for name, record in outputs.items())
    last = max(int(record.tick[-1]) + moved[name] for name, record in outputs.items())
    places = {
        name: (record.tick if record.usable.all() else record.tick[record.usable])
        + (moved[name] - first)
        for name, record in outputs.items()
    }
    size = last - first + 1
    return GateLine(interval, phase, first, size, places)


def _common_interval(records: Mapping[str, Record]) -> float:
    intervals = {key: record.interval for key, record in records.items()}
    smallest, largest = min(intervals.values()), max(intervals.values())
    if largest - smallest > 1e-6 * smallest:
        raise DataError(
            "the comparators of a chain have different gate times",
            value=", ".join(f"{key} {value:g} s" for key, value in intervals.items()),
            advice="Average the faster ones to the slowest gate first",
        )
    return smallest


def _phase(record: Record, interval: float) -> int:
    """Where the gates of a record lie on the line of its interval, ns; rounding averages out."""
    step = round(interval * SECOND_NS)
    angles = 2.0 * np.pi * (_some(record.tai_ns) % step) / step
    mean = np.angle(np.mean(np.exp(1j * angles)))
    return round(float(mean) / (2.0 * np.pi) * step)


def _some(column: NDArray[np.int64]) -> NDArray[np.int64]:
    """Rows from all over a record, enough to find where its gates lie."""
    return column[:: column.size // _ENOUGH + 1]


def _moved(record: Record, interval: float, phase: int) -> int:
    """How far a record's own ticks are from the common line, in gates."""
    step = round(interval * SECOND_NS)
    ahead = (_some(record.tai_ns) - phase) / step - _some(record.tick)
    moved = round(float(np.median(ahead)))
    off = float(np.max(np.abs(ahead - moved)))
    if off > _SLACK:
        raise DataError(
            "gates do not lie on the grid of the other comparators",
            value=f"off by {off * interval:.3f} s",
            where=record.name,
            allowed=f"At most {_SLACK * interval:g} s",
            advice="Check lag and interval in the header",
        )
    return moved
