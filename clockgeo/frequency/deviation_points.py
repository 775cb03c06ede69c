"""Points of a deviation: raw variances, expectations put right, noise and freedom."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.confidence import LAW_OF_ALPHA, freedom_of
from clockgeo.frequency.identification import dominant_exponent
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.partial_windows import WindowExpectations, noise_mixture
from clockgeo.frequency.stability_statistics import Statistic
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

__all__ = [
    "CurvePoints",
    "TimeLine",
    "exponents_of",
    "longest_factor",
    "total_points",
    "window_points",
]

_ENOUGH = 0.3
"""Share of all windows that must be complete for partly filled ones to be left aside."""
_AVERAGES = 30
"""Averages that an identification of the noise needs (common practice, no source)."""
_TOLD = 1 << 15
"""Averages that are enough to identify the noise to some hundredths of an exponent."""
_PLACES = 16
"""Partly filled windows in an averaging time."""
_FILL = 0.5
"""Least filling of a window, in units of the mean filling of the record."""


@dataclass(frozen=True, eq=False)
class CurvePoints:
    """What is known at each averaging factor, K of them."""

    factors: list[int]
    variance: NDArray[np.float64]
    edf: NDArray[np.float64]
    noise: list[str]
    count: NDArray[np.int64]
    partial: NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class TimeLine:
    """A record on its line of ticks, with running sums."""

    size: int
    y: NDArray[np.float64]
    total: NDArray[np.float64]
    count: NDArray[np.int32]
    starts: NDArray[np.int64]
    stops: NDArray[np.int64]

    @classmethod
    def of(cls, series: TickSeries) -> TimeLine:
        """Lay a series out, its mean taken off."""
        size = int(series.tick[-1] - series.tick[0]) + 1
        total, count = running_sums(series.tick, series.y, size, float(series.y.mean()))
        return cls(size, series.y, total, count, *runs_of(series.tick))

    @property
    def gapless(self) -> bool:
        """Whether no sample is missing."""
        return self.y.size == self.size

    @property
    def uptime(self) -> float:
        """Part of the line that holds samples, 0 to 1."""
        return self.y.size / self.size


def longest_factor(statistic: Statistic, record: TimeLine) -> int:
    """Longest averaging factor of a statistic: a quarter of a record with gaps."""
    if statistic.kind == "total" and statistic.order == 2:
        return record.size // 2
    if statistic.kind == "modified-total":
        return (record.size + 1) // 3
    if record.gapless:
        return (record.size + (statistic.kind == "modified")) // statistic.span
    return min(record.size // 4, record.size // statistic.span)


def total_points(
    statistic: Statistic, stretches: Sequence[TimeLine], factors: Sequence[int]
) -> CurvePoints:
    """Points of the total family, bias taken off, of stretches without gaps.

    Each stretch that is long enough for an averaging time counts by the squares it adds.
    """
    modified = statistic.kind == "modified-total"
    variance, edf, count = [], [], []
    exponents: list[int] = []
    for m in track(factors, statistic.name):
        long = [one for one in stretches if longest_factor(statistic, one) >= m]
        exponent = _next_exponent(long[0], m, exponents)
        exponents.append(exponent)
        squares, freedom, number = 0.0, 0.0, 0
        for one in long:
            raw, here = total_variance(one.y, m, order=statistic.order, modified=modified)
            bias = total_bias(exponent, m, one.size, order=statistic.order, modified=modified)
            squares += raw / bias * here
            freedom += freedom_of(statistic, exponent, m, one.size)
            number += here
        variance.append(squares / number)
        edf.append(freedom)
        count.append(number)
    return CurvePoints(
        list(factors),
        np.array(variance),
        np.array(edf),
        [LAW_OF_ALPHA[exponent] for exponent in exponents],
        np.array(count, dtype=np.int64),
        np.zeros(len(factors), dtype=bool),
    )


def _exponent(record: TimeLine, m: int, otherwise: int) -> int:
    """Ruling exponent at an averaging time; the last one where too few averages are left."""
    # A stretch from the middle tells as much as all of a long record.
    behind = record.size // m - _TOLD
    first = max(behind // 2, 0) * m
    grid = slice(first, first + _TOLD * m + 1 if behind > 0 else None, m)
    held, sums = np.diff(record.count[grid]), np.diff(record.total[grid])
    complete = held == m
    enough = complete if np.count_nonzero(complete) >= _AVERAGES else held >= m / 2.0
    if np.count_nonzero(enough) < _AVERAGES or not np.any(enough[1:] & enough[:-1]):
        return otherwise
    averages = np.where(enough, sums / np.maximum(held, 1), np.nan)
    try:
        exponent = dominant_exponent(averages, None, m)
        if exponent < 1 or m == 1:
            return exponent
        return dominant_exponent(averages, _r(record, m), m)  # white or flicker phase noise
    except DataError:
        return otherwise


def _r(record: TimeLine, m: int) -> float | None:
    """R(n): modified over plain Allan variance; None where too few windows are complete."""
    runs = record.starts, record.stops
    plain, pairs = complete_squares(record.total, *runs, m, 2, 1)
    modified, triples = complete_modified(record.total, *runs, m)
    if plain <= 0.0 or triples < m * _AVERAGES:
        return None
    return (modified / triples / m**2) / (plain / pairs)


def exponents_of(record: TimeLine, factors: Sequence[int]) -> list[int]:
    """Ruling exponents at all averaging times, which must increase.

    Phase noise falls faster than any frequency noise: once that rules it is not followed by phase
    noise, whatever few long averages look like.
    """
    exponents: list[int] = []
    for m in factors:
        exponents.append(_next_exponent(record, m, exponents))
    return exponents


def _next_exponent(record: TimeLine, m: int, before: Sequence[int]) -> int:
    exponent = _exponent(record, m, before[-1] if before else 0)
    return 0 if exponent > 0 and any(one <= 0 for one in before) else exponent


def window_points(
    statistic: Statistic, record: TimeLine, factors: Sequence[int], interval: float
) -> CurvePoints:
    """Points of all other statistics; averaging times that no window reaches are left out.

    Raises
    ------
    DataError
        If a deviation is zero.
    """
    reached, raw, count, filled = [], [], [], []
    for m in track(factors, statistic.name):
        one, number, partly = _raw_variance(statistic, record, m)
        if number == 0:
            continue
        if one <= 0.0:
            raise DataError(
                "a deviation is zero: the samples repeat themselves",
                value=f"tau = {m * interval:g} s",
            )
        reached.append(m)
        raw.append(one)
        count.append(number)
        filled.append(partly)
    variance, partial = np.array(raw), np.array(filled, dtype=bool)
    counts = np.array(count, dtype=np.int64)
    if not reached or not record.gapless:
        return _with_gaps(statistic, record, reached, interval, variance, counts, partial)
    exponents = exponents_of(record, factors)
    edf = [
        freedom_of(statistic, alpha, m, record.size)
        for alpha, m in zip(exponents, factors, strict=True)
    ]
    noise = [LAW_OF_ALPHA[alpha] for alpha in exponents]
    return CurvePoints(reached, variance, np.array(edf), noise, counts, partial)


def _with_gaps(
    statistic: Statistic,
    record: TimeLine,
    factors: Sequence[int],
    interval: float,
    raw: NDArray[np.float64],
    count: NDArray[np.int64],
    partial: NDArray[np.bool_],
) -> CurvePoints:
    """Put the expectation of partly filled windows right; noise and freedom from the mixture."""
    if not factors:
        empty = np.zeros(0)
        return CurvePoints([], empty, empty, [], count, partial)
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
    return CurvePoints(
        list(factors),
        raw * (whole @ levels) / (expected @ levels),
        np.array(edf),
        [LAW_OF_ALPHA[alpha] for alpha in exponents_of(record, factors)],
        count,
        partial,
    )


def _least(record: TimeLine) -> float:
    """Least filling of a window, as a share of its length."""
    return _FILL * record.uptime


def _stride(statistic: Statistic, m: int) -> int:
    """Distance of partly filled windows: sixteen to a length hold all that more would tell."""
    return m if statistic.kind == "plain" else max(m // _PLACES, 1)


def _raw_variance(statistic: Statistic, record: TimeLine, m: int) -> tuple[float, int, bool]:
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
    return (squares / weights / scale if number else 0.0), number, True
