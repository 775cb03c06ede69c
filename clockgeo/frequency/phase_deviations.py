"""Stability of a time error x(t) that is continuous through its gaps."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.averaging import averaging_factors
from clockgeo.frequency.confidence import LAW_OF_ALPHA, chi_squared_interval, freedom_of
from clockgeo.frequency.deviation_points import TimeLine, exponents_of
from clockgeo.frequency.deviations import StabilityCurve, stability_curve
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.stability_statistics import Statistic, find_statistic

__all__ = ["phase_stability_curve"]


def phase_stability_curve(
    phase: TickSeries,
    statistic: str = "overlapping-allan",
    *,
    interval: float,
    tau: str | Sequence[float] = "octave",
    level: float = 0.683,
) -> StabilityCurve:
    """Compute one statistic of a time error.

    Parameters
    ----------
    phase : TickSeries
        Valid time errors in s (its `y`) on an integer time line. No cycle may have been lost in a
        gap: what lies behind it must continue what lies before.
    statistic, interval, tau, level
        As in `stability_curve`.

    Raises
    ------
    DataError
        As in `stability_curve`.

    Notes
    -----
    The plain and overlapping kinds take every complete set x(t), x(t + τ), x(t + 2τ) (and
    x(t + 3τ)), whatever is missing between: unbiased for all noises (Sesia and Tavella 2008,
    Metrologia 45:S134). The modified and total kinds average phase and work on the frequency
    between neighbours. Freedom is that of a complete record times the share of sets there are.
    """
    found = find_statistic(statistic)
    together = np.diff(phase.tick) == 1
    frequency = TickSeries(phase.tick[:-1][together], np.diff(phase.y)[together] / interval)
    if bool(np.all(together)) or found.kind not in ("plain", "overlapping"):
        return stability_curve(frequency, statistic, interval=interval, tau=tau, level=level)
    if not np.isfinite(phase.y.sum()):
        raise DataError("time errors are not finite", advice="Leave them out, or flag them")
    if not interval > 0.0:
        raise DataError("the sampling interval must be positive", value=f"{interval} s")
    x = np.full(int(phase.tick[-1] - phase.tick[0]) + 1, np.nan)
    x[phase.tick - phase.tick[0]] = phase.y
    factors = averaging_factors(
        tau, interval=interval, largest=min((x.size - 1) // found.span, x.size // 4)
    )
    points = [(m, *_squares(found, x, m)) for m in factors]
    kept = [(m, mean, number) for m, mean, number in points if number]
    if len(kept) < len(points) and (not kept or not isinstance(tau, str)):
        raise DataError(
            "no complete set of time errors",
            value=f"tau = {next(m for m, _, number in points if not number) * interval:g} s",
            advice="Choose other averaging times",
        )
    taus = np.array([m for m, _, _ in kept]) * interval
    deviation = np.sqrt([mean for _, mean, _ in kept]) / taus
    if not np.all(deviation > 0.0):
        raise DataError("a deviation is zero: the samples repeat themselves")
    laws = exponents_of(TimeLine.of(frequency), [m for m, _, _ in kept])
    edf = np.array(
        [
            max(freedom_of(found, law, m, x.size - 1) * number / _possible(found, x.size, m), 1.0)
            for law, (m, _, number) in zip(laws, kept, strict=True)
        ]
    )
    ends = [chi_squared_interval(*each, level) for each in zip(deviation, edf, strict=True)]
    return StabilityCurve(
        statistic=statistic,
        tau=taus,
        deviation=deviation,
        lower=np.array([low for low, _ in ends]),
        upper=np.array([high for _, high in ends]),
        edf=edf,
        noise=tuple(LAW_OF_ALPHA[law] for law in laws),
        count=np.array([number for _, _, number in kept], dtype=np.int64),
        partial=np.zeros(taus.size, dtype=bool),
        level=level,
    )


def _stride(statistic: Statistic, m: int) -> int:
    return m if statistic.kind == "plain" else 1


def _possible(statistic: Statistic, size: int, m: int) -> int:
    return len(range(0, size - statistic.order * m, _stride(statistic, m)))


def _squares(statistic: Statistic, x: NDArray[np.float64], m: int) -> tuple[float, int]:
    """Mean of the squared differences, over 2 or 6, and the number of complete sets."""
    places = x.size - statistic.order * m
    parts = [x[k * m : k * m + places] for k in range(statistic.order + 1)]
    if statistic.order == 2:
        differences = parts[2] - 2.0 * parts[1] + parts[0]
    else:
        differences = parts[3] - 3.0 * (parts[2] - parts[1]) - parts[0]
    differences = differences[:: _stride(statistic, m)]
    there = differences[~np.isnan(differences)]
    scale = 2.0 if statistic.order == 2 else 6.0
    return (float(there @ there) / there.size / scale if there.size else 0.0), int(there.size)
