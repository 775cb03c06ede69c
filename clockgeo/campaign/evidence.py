"""What pictures need besides the result: the records with their flags, and the fitted noise."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.frequency import NoiseModel, TickSeries

__all__ = ["Curve", "Evidence", "GroupEvidence", "RecordEvidence"]


class Curve(Protocol):
    """A deviation against averaging time; arrays of one length."""

    @property
    def statistic(self) -> str:
        """Name of the statistic, such as ``overlapping-allan``."""

    @property
    def tau(self) -> ArrayLike:
        """Averaging times in s."""

    @property
    def deviation(self) -> ArrayLike:
        """Deviations, dimensionless (time deviations in s)."""

    @property
    def lower(self) -> ArrayLike:
        """Lower ends of the intervals."""

    @property
    def upper(self) -> ArrayLike:
        """Upper ends of the intervals; infinite where there is none."""


@dataclass(frozen=True, eq=False)
class RecordEvidence:
    """The record of one session.

    Attributes
    ----------
    session : str
    tai_ns : int64 array, shape (N,)
        Starts of the averaging intervals in TAI nanoseconds.
    y : float array, shape (N,)
        Fractional frequency as read, NaN where the row has no value.
    reasons : uint8 array, shape (N,)
        Flags of `frequency.Reason`; 0 where the row counts.
    interval : float
        Sampling interval in s.
    """

    session: str
    tai_ns: NDArray[np.int64]
    y: NDArray[np.float64]
    reasons: NDArray[np.uint8]
    interval: float


@dataclass(frozen=True, eq=False)
class GroupEvidence:
    """Sessions that share one noise process.

    Attributes
    ----------
    name : str
    sessions : tuple of str
    series : tuple of TickSeries
        Valid samples after all corrections, on one time line.
    interval : float
        Sampling interval in s.
    model : NoiseModel
        The model that the uncertainty follows.
    curves : tuple of Curve
        Deviations of the series, to be held against the model.
    """

    name: str
    sessions: tuple[str, ...]
    series: tuple[TickSeries, ...]
    interval: float
    model: NoiseModel
    curves: tuple[Curve, ...] = ()


@dataclass(frozen=True, eq=False)
class Evidence:
    """All records and noise groups of a campaign, in the document's order."""

    records: tuple[RecordEvidence, ...]
    groups: tuple[GroupEvidence, ...]
