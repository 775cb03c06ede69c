"""Stability of a record with gaps: ten statistics with their intervals.

Gaps are never closed up. Where complete windows are few, partly filled ones count too, weighted by
what they hold; what that does to their expectation follows from the power laws that the curve
itself shows, and is taken off.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.averaging import averaging_factors
from clockgeo.frequency.confidence import chi_squared_interval
from clockgeo.frequency.deviation_points import (
    TimeLine,
    longest_factor,
    total_points,
    window_points,
)
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.stability_statistics import find_statistic

__all__ = ["StabilityCurve", "stability_curve"]


_MOST_STRETCHES = 300
"""Complete stretches that count in total statistics; the longest tell nearly all."""
_SHORTEST = 4
"""Samples of the shortest stretch that counts."""


@dataclass(frozen=True, eq=False)
class StabilityCurve:
    """A deviation against averaging time; arrays of one length K.

    Attributes
    ----------
    statistic : str
    tau : float array
        Averaging times in s.
    deviation, lower, upper : float array
        Dimensionless, or s for the time deviations; ends of the interval at `level`.
    edf : float array
        Equivalent degrees of freedom.
    noise : tuple of str
        Ruling power law at each averaging time.
    count : int array
        Squares that were averaged.
    partial : bool array
        Whether partly filled windows took part.
    level : float
        Confidence level of the intervals.
    notes : tuple of str
    """

    statistic: str
    tau: NDArray[np.float64]
    deviation: NDArray[np.float64]
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    edf: NDArray[np.float64]
    noise: tuple[str, ...]
    count: NDArray[np.int64]
    partial: NDArray[np.bool_]
    level: float
    notes: tuple[str, ...] = ()


def stability_curve(
    series: TickSeries,
    statistic: str = "overlapping-allan",
    *,
    interval: float,
    tau: str | Sequence[float] = "octave",
    level: float = 0.683,
) -> StabilityCurve:
    """Compute one statistic of a record.

    Parameters
    ----------
    series : TickSeries
        Valid samples on an integer time line.
    statistic : str
        Name of the statistic, see `STATISTICS`.
    interval : float
        Length of a tick in s.
    tau : str or sequence of float
        See `averaging_factors`. The longest is a quarter of a record with gaps; of a complete one
        half of it, a third for the modified and Hadamard kinds.
    level : float
        Confidence level of the intervals.

    Raises
    ------
    DataError
        If the record is too short, constant, or not finite, or an averaging time is out of reach.

    Notes
    -----
    Estimators as in IEEE Std 1139 and NIST SP 1065. The total family needs a record without gaps:
    of one with gaps it takes every complete stretch that is long enough, which a note says.
    """
    found = find_statistic(statistic)
    _refuse_unfit(series, interval)
    notes: tuple[str, ...] = ()
    if found.order == 3:  # blind to a drift, which would pass for noise in its identification
        series = _without_drift(series)
    if found.total:
        stretches, notes = _complete_stretches(series)
        longest = longest_factor(found, stretches[0])
        factors = averaging_factors(tau, interval=interval, largest=longest)
        points = total_points(found, stretches, factors)
    else:
        record = TimeLine.of(series)
        longest = longest_factor(found, record)
        factors = averaging_factors(tau, interval=interval, largest=longest)
        points = window_points(found, record, factors, interval)
    left = [m for m in factors if m not in points.factors]
    if left:
        told = ", ".join(f"{m * interval:g}" for m in left)
        if not points.factors or not isinstance(tau, str):
            raise DataError(
                "no window of the record is filled well enough",
                value=f"tau = {told} s",
                advice="Choose other averaging times",
            )
        notes += (f"{statistic}: no windows of {told} s are filled well enough",)
    taus = np.array(points.factors) * interval
    scale = taus / np.sqrt(3.0) if found.in_time else np.ones(taus.size)
    deviation = np.sqrt(points.variance) * scale
    ends = [
        chi_squared_interval(one, freedom, level)
        for one, freedom in zip(deviation, points.edf, strict=True)
    ]
    return StabilityCurve(
        statistic=statistic,
        tau=taus,
        deviation=deviation,
        lower=np.array([low for low, _ in ends]),
        upper=np.array([high for _, high in ends]),
        edf=points.edf,
        noise=tuple(points.noise),
        count=points.count,
        partial=points.partial,
        level=level,
        notes=notes,
    )


def _without_drift(series: TickSeries) -> TickSeries:
    """Take the straight line of least squares off."""
    ticks = series.tick - series.tick[0]
    place = ticks - ticks.mean()
    slope = float(place @ series.y) / float(place @ place)
    return TickSeries(series.tick, series.y - slope * place)


def _refuse_unfit(series: TickSeries, interval: float) -> None:
    if not interval > 0.0:
        raise DataError("the sampling interval must be positive", value=f"{interval} s")
    if series.y.size < 3:
        raise DataError(
            "too few samples for a deviation", value=series.y.size, allowed="At least three"
        )
    if not np.isfinite(series.y.sum()):  # one pass, no copy: any NaN or infinity shows
        raise DataError(
            "samples are not finite",
            value=f"{np.count_nonzero(~np.isfinite(series.y))} of {series.y.size}",
            advice="Leave them out, or flag them",
        )
    if series.y.min() == series.y.max():
        raise DataError(
            "the record is constant and shows no noise",
            value=float(series.y[0]),
            advice="Check the value column",
        )


def _complete_stretches(series: TickSeries) -> tuple[list[TimeLine], tuple[str, ...]]:
    """Stretches without a gap, the longest first; those too short for any statistic left out."""
    edges = np.flatnonzero(np.diff(series.tick) > 1) + 1
    if not edges.size:
        return [TimeLine.of(series)], ()
    starts = np.concatenate(([0], edges))
    stops = np.concatenate((edges, [series.tick.size]))
    order = np.argsort(starts - stops, kind="stable")[:_MOST_STRETCHES]
    parts = [slice(starts[k], stops[k]) for k in order if stops[k] - starts[k] >= _SHORTEST]
    kept = [
        TimeLine.of(TickSeries(series.tick[part], series.y[part]))
        for part in parts
        if np.ptp(series.y[part]) > 0.0
    ]
    if not kept:
        raise DataError(
            "no complete stretch is long enough for a total statistic",
            value=f"{int(np.max(stops - starts))} samples",
            advice="Use overlapping-allan or overlapping-hadamard, which respect gaps",
        )
    used = sum(one.size for one in kept)
    note = (
        f"total statistics need a record without gaps; {len(kept)} complete stretches with "
        f"{used} of {series.tick.size} samples were used, the longest of {kept[0].size}"
    )
    return kept, (note,)
