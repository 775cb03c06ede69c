"""Correlations and closures of the sessions as they stand in the result."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from clockgeo.campaign.results import ClosureResult, CorrelationResult
from clockgeo.levelling.closures import Closure, closures_of
from clockgeo.levelling.correlations import correlations_of
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import SessionMean

__all__ = ["closure_results", "correlation_results"]

_LIMIT = 3.0


def correlation_results(
    means: Sequence[SessionMean], model: LinearModel
) -> Iterator[CorrelationResult]:
    """Correlation coefficients of all pairs of sessions that have any."""
    for one in correlations_of(model, [mean.id for mean in means]):
        yield CorrelationResult(
            first=one.first, second=one.second, coefficient=one.coefficient, parts=one.parts
        )


def closure_results(means: Sequence[SessionMean], model: LinearModel) -> Iterator[ClosureResult]:
    """Loops of clocks with their verdicts."""
    for one in closures_of(means, model):
        yield ClosureResult(
            sessions=one.sessions,
            signs=one.signs,
            misclosure=one.misclosure,
            u=one.u,
            normalised=one.normalised,
            verdict=_verdict(one),
        )


def _verdict(closure: Closure) -> str:
    if closure.normalised is None:
        return "identity"
    return "closes" if abs(closure.normalised) <= _LIMIT else "does not close"
