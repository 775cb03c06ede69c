"""From recorded time errors to the fractional frequency between them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from clockgeo.errors import DataError
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.record import Record

__all__ = ["frequency_of_time_errors"]


def frequency_of_time_errors(record: Record) -> Record:
    """Turn a record of time errors into one of frequencies.

    Parameters
    ----------
    record : Record
        Its `y` holds time errors in s at the epochs.

    Returns
    -------
    Record
        A row from each epoch to the next: y = (x(t + τ0) - x(t))/τ0 where both time errors are
        usable and one interval apart, else not usable. The time errors themselves go along, because
        what is missing between two of them is not lost.

    Raises
    ------
    DataError
        If no two usable time errors are one interval apart.
    """
    x, usable = record.y, record.usable
    steps = np.diff(record.tick)
    together = usable[:-1] & usable[1:] & (steps == 1)
    if not np.any(together):
        raise DataError(
            "no two time errors are one interval apart",
            value=f"{np.count_nonzero(usable)} usable rows every {record.interval:g} s",
            where=record.name,
            advice="Check the stamps, or state the interval",
        )
    y = np.full(steps.size, np.nan)
    y[together] = np.diff(x)[together] / record.interval
    return replace(
        record,
        tai_ns=record.tai_ns[:-1],
        y=y,
        usable=together,
        tick=record.tick[:-1],
        time_error=TickSeries(record.tick[usable], x[usable]),
    )
