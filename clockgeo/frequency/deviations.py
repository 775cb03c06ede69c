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
from clockgeo.frequency.confidence import LAW_OF_ALPHA, chi_squared_interval, freedom_of
from clockgeo.frequency.contrasts import LAWS
from clockgeo.frequency.identification import dominant_exponent
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.partial_windows import WindowExpectations, noise_mixture
from clockgeo.frequency.stability_statistics import Statistic, find_statistic
from clockgeo.frequency.total_deviations import total_bias, total_variance
from clockgeo.frequency.window_freedom import freedom_with_gaps
from clockgeo.frequency.window_sums import (
    complete_modified,
    complete_squares,
    partial_modified,
    partial_squares,
    running_sums,
    runs_of,
)
from clockgeo.progress import track

__all__ = ["StabilityCurve", "stability_curve"]

_ENOUGH = 0.3
"""Share of all windows that must be complete for partly filled ones to be left aside."""
_PLACES = 16
"""Partly filled windows in an averaging time."""
_FILL = 0.5
"""Least filling of a window, in units of the mean filling of the record."""


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
    Estimators as in IEEE Std 1139 and NIST SP 1065. The total family needs a record without gaps
    and takes its longest complete stretch, which a note says.
    """
    found = find_statistic(statistic)
    _refuse_unfit(series, interval)
    notes: tuple[str, ...] = ()
    if found.total:
        series, notes = _longest_stretch(series)
    record = _Line.of(series)
    factors = averaging_factors(tau, interval=interval, largest=_longest_factor(found, record))
    estimator = _total_points if found.total else _window_points
    points = estimator(found, record, factors, interval)
    taus = np.array(factors) * interval
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


@dataclass(frozen=True, eq=False)
class _Points:
    variance: NDArray[np.float64]
    edf: NDArray[np.float64]
    noise: list[str]
    count: NDArray[np.int64]
    partial: NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class _Line:
    """A record on its line of ticks, with running sums."""

    size: int
    y: NDArray[np.float64]
    total: NDArray[np.float64]
    count: NDArray[np.int32]
    starts: NDArray[np.int64]
    stops: NDArray[np.int64]

    @classmethod
    def of(cls, series: TickSeries) -> _Line:
        size = int(series.tick[-1] - series.tick[0]) + 1
        total, count = running_sums(series.tick, series.y, size, float(series.y.mean()))
        return cls(size, series.y, total, count, *runs_of(series.tick))

    @property
    def gapless(self) -> bool:
        return self.y.size == self.size

    @property
    def uptime(self) -> float:
        return self.y.size / self.size


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


def _longest_stretch(series: TickSeries) -> tuple[TickSeries, tuple[str, ...]]:
    edges = np.flatnonzero(np.diff(series.tick) > 1) + 1
    if not edges.size:
        return series, ()
    starts = np.concatenate(([0], edges))
    stops = np.concatenate((edges, [series.tick.size]))
    longest = int(np.argmax(stops - starts))
    part = slice(starts[longest], stops[longest])
    note = (
        f"total statistics need a record without gaps; the longest complete stretch of "
        f"{stops[longest] - starts[longest]} of {series.tick.size} samples was used"
    )
    stretch = TickSeries(series.tick[part], series.y[part])
    if stretch.y.size < 3 or np.ptp(stretch.y) == 0.0:
        raise DataError(
            "no complete stretch is long enough for a total statistic",
            value=f"{stretch.y.size} samples",
            advice="Use overlapping-allan or overlapping-hadamard, which respect gaps",
        )
    return stretch, (note,)


def _longest_factor(statistic: Statistic, record: _Line) -> int:
    if statistic.kind == "total" and statistic.order == 2:
        return record.size // 2
    if statistic.kind == "modified-total":
        return (record.size + 1) // 3
    if record.gapless:
        return (record.size + (statistic.kind == "modified")) // statistic.span
    return min(record.size // 4, record.size // statistic.span)


def _total_points(
    statistic: Statistic, record: _Line, factors: Sequence[int], interval: float
) -> _Points:
    del interval
    modified = statistic.kind == "modified-total"
    variance, edf, noise, count = [], [], [], []
    exponent = 0
    for m in track(factors, statistic.name):
        raw, number = total_variance(record.y, m, order=statistic.order, modified=modified)
        exponent = _exponent(record, m, exponent)
        bias = total_bias(exponent, m, record.size, order=statistic.order, modified=modified)
        variance.append(raw / bias)
        edf.append(freedom_of(statistic, exponent, m, record.size))
        noise.append(LAW_OF_ALPHA[exponent])
        count.append(number)
    return _Points(
        np.array(variance),
        np.array(edf),
        noise,
        np.array(count, dtype=np.int64),
        np.zeros(len(factors), dtype=bool),
    )


def _exponent(record: _Line, m: int, otherwise: int) -> int:
    """Ruling exponent at an averaging time, of a complete record; the last one where data end."""
    averages = np.diff(record.total[::m]) / m
    if averages.size < 30:
        return otherwise
    ratio = None
    if m > 1:
        runs = record.starts, record.stops
        plain, pairs = complete_squares(record.total, *runs, m, 2, 1)
        modified, triples = complete_modified(record.total, *runs, m)
        if plain > 0.0 and triples:
            ratio = (modified / triples / m**2) / (plain / pairs)
    return dominant_exponent(averages, ratio, m)


def _window_points(
    statistic: Statistic, record: _Line, factors: Sequence[int], interval: float
) -> _Points:
    raw, count, filled = [], [], []
    for m in track(factors, statistic.name):
        one, number, partly = _raw_variance(statistic, record, m)
        if one <= 0.0:
            raise DataError(
                "a deviation is zero: the samples repeat themselves",
                value=f"tau = {m * interval:g} s",
            )
        raw.append(one)
        count.append(number)
        filled.append(partly)
    variance, partial = np.array(raw), np.array(filled, dtype=bool)
    counts = np.array(count, dtype=np.int64)
    if not record.gapless:
        return _with_gaps(statistic, record, factors, interval, variance, counts, partial)
    exponents, exponent = [], 0
    for m in factors:
        exponent = _exponent(record, m, exponent)
        exponents.append(exponent)
    edf = [
        freedom_of(statistic, alpha, m, record.size)
        for alpha, m in zip(exponents, factors, strict=True)
    ]
    noise = [LAW_OF_ALPHA[alpha] for alpha in exponents]
    return _Points(variance, np.array(edf), noise, counts, partial)


def _with_gaps(
    statistic: Statistic,
    record: _Line,
    factors: Sequence[int],
    interval: float,
    raw: NDArray[np.float64],
    count: NDArray[np.int64],
    partial: NDArray[np.bool_],
) -> _Points:
    """Put the expectation of partly filled windows right; noise and freedom from the mixture."""
    windows = WindowExpectations(statistic, record.count, record.starts, record.stops, interval)
    whole = np.array([windows.complete(m) for m in factors])
    expected = whole.copy()
    for place in np.flatnonzero(partial).tolist():
        m = factors[place]
        expected[place] = windows.partial(m, _stride(statistic, m), _least(record))
    independent = record.y.size / np.array(factors)
    levels = noise_mixture(raw, expected, np.maximum(np.minimum(count, independent), 1.0))
    edf = [
        freedom_with_gaps(
            record.count,
            m,
            levels,
            order=statistic.order,
            modified=statistic.kind == "modified",
            plain=statistic.kind == "plain",
            least=_least(record) if partly else 1.0,
            interval=interval,
        )
        for m, partly in zip(factors, partial, strict=True)
    ]
    return _Points(
        raw * (whole @ levels) / (expected @ levels),
        np.array(edf),
        [LAWS[int(place)] for place in np.argmax(whole * levels, axis=1)],
        count,
        partial,
    )


def _least(record: _Line) -> float:
    """Least filling of a window, as a share of its length."""
    return _FILL * record.uptime


def _stride(statistic: Statistic, m: int) -> int:
    """Distance of partly filled windows: sixteen to a length hold all that more would tell."""
    return m if statistic.kind == "plain" else max(m // _PLACES, 1)


def _raw_variance(statistic: Statistic, record: _Line, m: int) -> tuple[float, int, bool]:
    """Variance from complete windows, or from partly filled ones where those are few."""
    order, modified = statistic.order, statistic.kind == "modified"
    runs = record.starts, record.stops
    if modified:
        squares, number = complete_modified(record.total, *runs, m)
        squares /= float(m) ** 4
    else:
        stride = m if statistic.kind == "plain" else 1
        squares, number = complete_squares(record.total, *runs, m, order, stride)
        squares /= float(m) ** 2
    possible = record.size - statistic.span * m + 1 + modified
    if statistic.kind == "plain":
        possible = -(-possible // m)
    scale = 2.0 if order == 2 else 6.0
    if number >= _ENOUGH * possible:
        return squares / number / scale, number, False
    stride, least = _stride(statistic, m), _least(record)
    if modified:
        squares, weights, number = partial_modified(
            record.total, record.count, m, stride, max(least * float(m) ** 2, 1.0)
        )
    else:
        squares, weights, number = partial_squares(
            record.total, record.count, m, order, stride, max(least * m, 1.0)
        )
    if number == 0:
        raise DataError(
            "no window of the record is filled well enough",
            value=f"averaging factor {m}",
            advice="Choose shorter averaging times",
        )
    return squares / weights / scale, number, True
