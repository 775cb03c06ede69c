"""All that is told of the stability of one record: curves, noise model, mean and what limits it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.deviations import StabilityCurve, stability_curve
from clockgeo.frequency.diagnosis import Finding, diagnose
from clockgeo.frequency.mean import TickSeries, mean_covariance
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.noise_fit import NoiseFit, fit_noise
from clockgeo.frequency.phase_deviations import phase_stability_curve
from clockgeo.frequency.power_law_fit import PowerLawFit, fit_power_laws
from clockgeo.frequency.record import Record

__all__ = ["RecordMean", "RecordStability", "assess_stability"]

_SHORT = 8
"""Averaging factors up to which the weighting of a counter shapes an Allan deviation: a mean of m
rows weighted by triangles has 1 - 1/(3m) of the white variance, 2 % in deviation at m = 8."""


@dataclass(frozen=True)
class RecordMean:
    """Mean of a record and how sure it is.

    Attributes
    ----------
    y : float
        Mean of the valid rows.
    u : float
        Standard uncertainty under the fitted noise; under white noise where none could be fitted.
    valid_seconds, span_seconds : float
        Time of the valid rows, and from the first row to the last, valid or not.
    uptime : float
        Valid part of the span, 0 to 1.
    """

    y: float
    u: float
    valid_seconds: float
    span_seconds: float
    uptime: float


@dataclass(frozen=True, eq=False)
class RecordStability:
    """Stability of one record.

    Attributes
    ----------
    record : Record
    curves : tuple of StabilityCurve
        One for each statistic asked for.
    fit : NoiseFit or None
        Noise of long averages, which u of the mean follows from; None where there are too few
        valid rows.
    laws : PowerLawFit or None
        Levels of all power laws, from single rows to the whole record.
    mean : RecordMean
    tick : int64 array, shape (V,)
        Places of the rows that counted.
    findings : tuple of Finding
        What makes naive figures wrong, see `diagnose`.
    notes : tuple of str
        What the reader of the numbers must know.
    """

    record: Record
    curves: tuple[StabilityCurve, ...]
    fit: NoiseFit | None
    laws: PowerLawFit | None
    mean: RecordMean
    tick: NDArray[np.int64]
    findings: tuple[Finding, ...]
    notes: tuple[str, ...]

    @property
    def model(self) -> NoiseModel | None:
        """The fitted power laws with the drift; None where there are too few valid rows."""
        if self.fit is None or self.laws is None:
            return None
        return self.laws.model.model_copy(update={"drift": self.fit.model.drift})


def assess_stability(
    record: Record,
    statistics: Sequence[str] = ("overlapping-allan",),
    *,
    tau: str | Sequence[float] = "octave",
    level: float = 0.683,
    valid: NDArray[np.bool_] | None = None,
) -> RecordStability:
    """Compute curves, noise model and the uncertainty of the mean of one record.

    Parameters
    ----------
    record : Record
    statistics : sequence of str
        Names of `STATISTICS`.
    tau : str or sequence of float
        Averaging times, see `averaging_factors`.
    level : float
        Confidence level of the intervals of the curves.
    valid : bool array, shape (N,), optional
        Rows that count; the usable ones if not given.

    Raises
    ------
    DataError
        If the record has no valid row, or a curve cannot be computed.
    """
    counted = record.usable if valid is None else record.usable & valid
    if not np.any(counted):
        raise DataError(
            "no row of the record is valid",
            value=f"{len(record)} rows",
            where=record.name,
            advice="Check the flag column and what counts as valid",
        )
    series = TickSeries(record.tick[counted], record.y[counted])
    try:
        curves = tuple(
            _curve(record, series, name, tau, level, whole=valid is None) for name in statistics
        )
    except DataError as error:
        raise DataError(
            error.what,
            value=error.value,
            where=error.where or record.name,
            allowed=error.allowed,
            advice=error.advice,
        ) from None
    findings = diagnose(record, valid=counted)
    fit, laws, fit_note = _fitted(series, record)
    mean = _mean(record, series, fit, findings)
    notes = [*record.notes, *dict.fromkeys(note for curve in curves for note in curve.notes)]
    notes += [note for note in (fit_note, _weighting_note(record)) if note]
    return RecordStability(
        record=record,
        curves=curves,
        fit=fit,
        laws=laws,
        mean=mean,
        tick=series.tick,
        findings=findings,
        notes=tuple(notes),
    )


def _curve(
    record: Record,
    series: TickSeries,
    statistic: str,
    tau: str | Sequence[float],
    level: float,
    *,
    whole: bool,
) -> StabilityCurve:
    """One curve; of the time errors themselves where they were recorded and all count."""
    if record.time_error is not None and whole:
        return phase_stability_curve(
            record.time_error, statistic, interval=record.interval, tau=tau, level=level
        )
    return stability_curve(series, statistic, interval=record.interval, tau=tau, level=level)


def _fitted(
    series: TickSeries, record: Record
) -> tuple[NoiseFit | None, PowerLawFit | None, str | None]:
    interval, plain = record.interval, record.weighting != "lambda"
    try:
        fit = fit_noise([series], interval=interval)
        undrifted = _undrifted(series, fit.model.drift * interval)
        laws = fit_power_laws([undrifted], interval=interval, single_samples=plain)
    except DataError as error:
        note = f"no noise model was fitted: {error.what}; u of the mean is for white noise"
        return None, None, note
    return fit, laws, _short_note(laws) if plain and not laws.short_times else None


def _undrifted(series: TickSeries, drift: float) -> TickSeries:
    if not drift:
        return series
    return TickSeries(series.tick, series.y - drift * (series.tick - series.tick[0]))


def _short_note(laws: PowerLawFit) -> str:
    return (
        "short averages follow no power law together with the long ones, as behind a servo: the "
        f"noise model holds from {laws.from_seconds:.3g} s"
    )


def _mean(
    record: Record, series: TickSeries, fit: NoiseFit | None, findings: Sequence[Finding]
) -> RecordMean:
    interval = record.interval
    ticks = int(record.tick[-1] - record.tick[0]) + 1
    if fit is not None:
        u = float(np.sqrt(mean_covariance(fit.averaged, [series], interval=interval)[0, 0]))
    else:
        factor = max([1.0, *(finding.factor or 1.0 for finding in findings)])
        u = factor * float(np.std(series.y, ddof=1)) / float(np.sqrt(series.y.size))
    return RecordMean(
        y=float(np.mean(series.y)),
        u=u,
        valid_seconds=series.y.size * interval,
        span_seconds=ticks * interval,
        uptime=series.y.size / ticks,
    )


def _weighting_note(record: Record) -> str | None:
    if record.weighting != "lambda":
        return None
    return (
        "the counter weights each row by a triangle (Λ): up to about "
        f"{_SHORT * record.interval:g} s plain deviations lie below those of unweighted averages "
        "and fall like the modified one; the noise model rests on means of many rows"
    )
