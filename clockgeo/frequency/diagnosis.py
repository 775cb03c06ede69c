"""Data that lie: interpolated rows, servo oscillations, steps between re-locks, in words."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.neighbours import (
    Neighbours,
    correlation_of_neighbours,
    interpolated_cycle,
)
from clockgeo.frequency.record import Record
from clockgeo.frequency.relocks import steps_across_gaps
from clockgeo.frequency.running import running_median_and_spread
from clockgeo.times import iso_utc

__all__ = ["Finding", "diagnose"]

_LEVEL_WINDOW = 1_200.0
"""Length, s, of the running median that is taken as the local level. Taking it off lowers the sum
of 60 correlations by about 0.45 (2 60 + 1)/1200, 5 %."""
_BESIDE_GAPS = 300.0
"""Most time, s, averaged on either side of a gap."""
_LONGEST_HALF_PERIOD = 30.0
"""Half a period, s, of the slowest servo; slower swings are noise, or what the median left."""
_RELOCK_GAP = 30.0
"""Shortest gap, s, after which a clock is taken to have been locked again."""


@dataclass(frozen=True)
class Finding:
    """Something about a record that makes naive figures wrong.

    Attributes
    ----------
    kind : str
        ``"interpolated"``, ``"correlated"``, ``"oscillation"`` or ``"step"``.
    words : str
        What was found, for people.
    tai_ns : int or None
        Where, for a step: start of the first row after the gap.
    size : float or None
        Size of a step, fractional.
    u : float or None
        Standard uncertainty of that size.
    period : float or None
        Clock cycle, or period of the oscillation, s.
    factor : float or None
        True u of the mean over the naive s/√N.
    """

    kind: Literal["interpolated", "correlated", "oscillation", "step"]
    words: str
    tai_ns: int | None = None
    size: float | None = None
    u: float | None = None
    period: float | None = None
    factor: float | None = None


def diagnose(record: Record, *, valid: NDArray[np.bool_] | None = None) -> tuple[Finding, ...]:
    """Look for what makes the naive uncertainty of a record wrong.

    Parameters
    ----------
    record : Record
        As read.
    valid : bool array, shape (N,), optional
        Rows that count, such as `Screening.valid`; the usable ones if not given.

    Returns
    -------
    tuple of Finding
        Empty if nothing was found, or there are too few rows (500) to tell.

    Raises
    ------
    DataError
        If `valid` has another length than the record, or marks rows without a value.
    """
    counted = record.usable if valid is None else np.asarray(valid, dtype=bool)
    if counted.shape != record.y.shape or np.any(counted & ~record.usable):
        raise DataError("valid rows must be usable rows of the record", where=record.name)
    tick, y = record.tick[counted], record.y[counted]
    if y.size < 3:
        return ()
    level_width = max(10, round(_LEVEL_WINDOW / record.interval))
    running = running_median_and_spread(tick, y, width=level_width)
    residuals = y - running.median
    neighbours = correlation_of_neighbours(tick, residuals)
    findings = []
    factor = 1.0
    if neighbours is not None:
        findings = list(_correlations(tick, residuals, neighbours, record.interval))
        factor = max([1.0, *(finding.factor or 1.0 for finding in findings)])
    steps = steps_across_gaps(
        tick,
        y,
        gap=round(_RELOCK_GAP / record.interval),
        width=max(10, round(_BESIDE_GAPS / record.interval)),
        scatter=factor * float(np.median(running.spread)),
    )
    epochs = record.tai_ns[counted]
    for step in steps:
        epoch = int(epochs[step.row])
        words = (
            f"the level steps by {step.size:.2g} (u {step.u:.1g}) across the gap that ends at "
            f"{iso_utc(epoch, digits=0)}"
        )
        findings.append(Finding("step", words, tai_ns=epoch, size=step.size, u=step.u))
    return tuple(findings)


def _correlations(
    tick: NDArray[np.int64],
    residuals: NDArray[np.float64],
    neighbours: Neighbours,
    interval: float,
) -> Iterator[Finding]:
    """Findings about neighbouring rows; an interpolation explains their correlation."""
    if not neighbours.correlated:
        return
    interpolation = interpolated_cycle(tick, residuals, neighbours)
    if interpolation is not None:
        cycle = interpolation.cycle * interval
        yield Finding(
            "interpolated",
            f"the rows look interpolated from a clock cycle of {cycle:.3g} s: "
            f"s/√N is {interpolation.factor:.3g} times too small",
            period=cycle,
            factor=interpolation.factor,
        )
        return
    factor = neighbours.factor
    size = (
        f"{factor:.2g} times too small" if factor > 1.0 else f"{1.0 / factor:.2g} times too large"
    )
    yield Finding(
        "correlated",
        f"neighbouring rows are correlated ({neighbours.correlation[1]:.2f} at one interval): "
        f"s/√N is {size}",
        factor=factor,
    )
    half = neighbours.half_period
    if half is not None and 2 <= half <= _LONGEST_HALF_PERIOD / interval:
        period = 2.0 * half * interval
        yield Finding(
            "oscillation",
            f"the values oscillate with a period near {period:.3g} s, as a servo does",
            period=period,
        )
