"""Screening: which rows of a record should not count, each with its reason; nothing is deleted."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import IntFlag
from typing import Annotated

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator

from clockgeo.errors import DataError
from clockgeo.frequency.record import Record
from clockgeo.frequency.running import Running, running_median_and_spread
from clockgeo.tables import Instant, Positive, Table
from clockgeo.times import tai_from_iso

__all__ = ["Mask", "Reason", "Screening", "ScreeningRules", "screen"]


class Mask(Table):
    """A time that somebody decided to leave out."""

    start: Instant
    """First instant left out; UTC where no zone is given."""
    stop: Instant
    """First instant that counts again."""
    author: str = Field(min_length=1)
    """Who decided."""
    reason: str = Field(min_length=1)
    """Why."""

    @model_validator(mode="after")
    def _ordered(self) -> Mask:
        if self.stop <= self.start:
            message = f"a mask must stop after its start, {self.start.isoformat()}"
            raise ValueError(message)
        return self


class ScreeningRules(Table):
    """How epochs of a record are flagged. Every rule can be switched off."""

    gross_bound: Positive | None = None
    """Largest credible distance of a value from the median of the record, fractional."""
    outlier_threshold: Annotated[float, Field(ge=3.0)] | None = 6.0
    """Distance from the running median, in robust standard deviations; null finds no outliers."""
    window: Positive = 300.0
    """Length of the running median, s: long against the servo, short against drift."""
    cycle_slips: bool = True
    """Whether isolated outliers are tested for whole lost cycles, where the carrier is known."""
    largest_slip: Annotated[int, Field(ge=1)] = 10
    """Most cycles lost in one slip."""
    slip_tolerance: Annotated[float, Field(gt=0.0, lt=0.5)] = 0.2
    """Largest distance from a whole number of cycles. Slips are named only where it holds three
    standard deviations of the noise."""
    masks: tuple[Mask, ...] = ()
    """Times left out by hand."""


class Reason(IntFlag):
    """Why a row does not count; a row may have several reasons."""

    NOT_USABLE = 1
    """The file gives no value, or its flag says so."""
    OUT_OF_BOUNDS = 2
    """Further from the record's median than the gross bound."""
    OUTLIER = 4
    """Further from the running median than the threshold."""
    CYCLE_SLIP = 8
    """An isolated outlier by a whole number of cycles in one interval."""
    MASKED = 16
    """Left out by hand."""

    @property
    def words(self) -> str:
        """The reasons as words, joined by a comma."""
        return ", ".join(reason.name.lower() for reason in self if reason.name)


@dataclass(frozen=True, eq=False)
class Screening:
    """The verdict on every row of a record.

    Attributes
    ----------
    record : Record
        The record as read; untouched.
    rules : ScreeningRules
        The rules that were used.
    reasons : uint8 array, shape (N,)
        Sum of the `Reason` flags of each row; 0 where the row counts.
    running : Running or None
        Level and spread of the usable rows, where outliers were looked for.
    notes : tuple of str
        What is worth telling about the result.
    """

    record: Record
    rules: ScreeningRules
    reasons: NDArray[np.uint8]
    running: Running | None
    notes: tuple[str, ...]

    @property
    def valid(self) -> NDArray[np.bool_]:
        """Rows that count, shape (N,)."""
        return np.asarray(self.reasons == 0)

    @property
    def counts(self) -> dict[str, int]:
        """Number of rows per reason; a row with two reasons counts for both."""
        return {reason.words: int(np.count_nonzero(self.reasons & reason)) for reason in Reason}

    @property
    def mean_with(self) -> float:
        """Mean of the rows that count, fractional; NaN if there is none."""
        return float(np.mean(self.record.y[self.valid])) if np.any(self.valid) else np.nan

    @property
    def mean_without(self) -> float:
        """Mean of all usable rows, as if nothing had been screened, fractional."""
        usable = self.record.usable
        return float(np.mean(self.record.y[usable])) if np.any(usable) else np.nan

    def flagged(self) -> NDArray[np.int64]:
        """Positions of usable rows that screening flagged."""
        return np.flatnonzero((self.reasons != 0) & self.record.usable)


def screen(
    record: Record, rules: ScreeningRules | None = None, *, carrier_hz: float | None = None
) -> Screening:
    """Flag the rows of a record that should not count.

    Parameters
    ----------
    record : Record
        As read.
    rules : ScreeningRules, optional
        The usual ones if not given.
    carrier_hz : float, optional
        Optical frequency whose cycles are counted, Hz; without it no cycle slip is named.

    Returns
    -------
    Screening
        Reasons per row, counts, and the mean with and without.

    Raises
    ------
    DataError
        If the carrier is not positive.

    Notes
    -----
    A row is an outlier when it is more than `outlier_threshold` robust standard deviations from
    the running median (`running_median_and_spread`). The spread is that of the values, never of
    their differences: a servo that makes neighbours alike makes differences small, and would have
    ordinary excursions flagged. On clean white noise six deviations flag less than one row in
    10^7; six rather than fewer because every flag that is no fault makes the mean a little worse.
    An outlier whose neighbours are none and which lies n/(τ0 ν) off, n whole, is a cycle slip.
    """
    if carrier_hz is not None and not carrier_hz > 0.0:
        raise DataError("the carrier must be positive", value=carrier_hz, where=record.name)
    rules = ScreeningRules() if rules is None else rules
    reasons = np.where(record.usable, 0, Reason.NOT_USABLE).astype(np.uint8)
    tick, y = record.valid()
    flags = np.zeros(y.size, dtype=np.uint8)
    running = None
    if rules.gross_bound is not None and y.size:
        flags[np.abs(y - np.median(y)) > rules.gross_bound] |= np.uint8(Reason.OUT_OF_BOUNDS)
    if rules.outlier_threshold is not None and y.size > 2:
        width = max(10, round(rules.window / record.interval))
        running = running_median_and_spread(tick, y, width=width)
        flags |= _outliers(tick, y, running, record.interval, rules, carrier_hz)
    reasons[record.usable] = flags
    for mask in rules.masks:
        start, stop = (tai_from_iso(instant.isoformat()) for instant in (mask.start, mask.stop))
        reasons[(record.tai_ns >= start) & (record.tai_ns < stop)] |= np.uint8(Reason.MASKED)
    return Screening(record, rules, reasons, running, tuple(_notes(record, reasons, running)))


def _outliers(
    tick: NDArray[np.int64],
    y: NDArray[np.float64],
    running: Running,
    interval: float,
    rules: ScreeningRules,
    carrier_hz: float | None,
) -> NDArray[np.uint8]:
    assert rules.outlier_threshold is not None
    distance = y - running.median
    # A spread of zero means that most values are equal: then no distance can be judged.
    outlying = np.abs(distance) > rules.outlier_threshold * running.spread
    outlying &= running.spread > 0.0
    flags = np.where(outlying, Reason.OUTLIER, 0).astype(np.uint8)
    if carrier_hz is None or not rules.cycle_slips or not np.any(outlying):
        return flags
    rows = np.flatnonzero(outlying)
    cycles = distance[rows] * carrier_hz * interval
    noise = running.spread[rows] * carrier_hz * interval
    whole = np.rint(cycles)
    is_whole = (whole != 0) & (np.abs(whole) <= rules.largest_slip)
    # No further off than the noise explains, with a little for the level.
    is_whole &= np.abs(cycles - whole) <= np.minimum(rules.slip_tolerance, 4.0 * noise + 0.02)
    is_whole &= 3.0 * noise <= rules.slip_tolerance
    slips = rows[is_whole & _isolated(tick, rows)]
    flags[slips] = Reason.CYCLE_SLIP
    return flags


def _isolated(tick: NDArray[np.int64], rows: NDArray[np.int64]) -> NDArray[np.bool_]:
    """Whether no other of these rows is on a neighbouring tick."""
    apart = np.diff(tick[rows]) > 1
    return np.asarray(np.append(True, apart) & np.append(apart, True))


def _notes(record: Record, reasons: NDArray[np.uint8], running: Running | None) -> Iterator[str]:
    if running is None:
        return
    if not np.all(running.spread > 0.0):
        yield "most values are equal in places; no outliers can be found there"
    found = reasons[record.usable] & (Reason.OUTLIER | Reason.CYCLE_SLIP) != 0
    above = int(np.count_nonzero(record.y[record.usable][found] > running.median[found]))
    below = int(np.count_nonzero(found)) - above
    if above + below >= 10 and not 0.2 < above / (above + below) < 0.8:
        yield (
            f"outliers lie on one side ({above} above, {below} below): "
            "leaving them out moves the mean; look for their cause"
        )
