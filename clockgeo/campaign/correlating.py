"""Correlations and closures of a campaign as they stand in the result."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from clockgeo.campaign.results import ClosureResult, CorrelationResult
from clockgeo.levelling.closures import Closure, closures_of
from clockgeo.levelling.correlations import correlations_of, single_rows
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import NumberOf, SessionMean
from clockgeo.levelling.solution import Solution

__all__ = ["closure_results", "correlation_results"]

_LIMIT = 3.0


def correlation_results(
    means: Sequence[SessionMean],
    solution: Solution,
    solved: Sequence[str],
    pairs: Sequence[tuple[str, str]],
) -> Iterator[CorrelationResult]:
    """Correlation coefficients of all pairs of sessions, of sites and of differences.

    Parameters
    ----------
    means : sequence of SessionMean
    solution : Solution
    solved : sequence of str
        Sites with a geopotential number.
    pairs : sequence of (str, str)
        Differences that are reported, second minus first.
    """
    combinations = {
        "geopotential_number": {site: {NumberOf(site): 1.0} for site in solved},
        "difference": {
            f"{second} - {first}": {NumberOf(second): 1.0, NumberOf(first): -1.0}
            for first, second in pairs
        },
    }
    quantities = {"session": single_rows(solution.model, [mean.id for mean in means])}
    for kind, named in combinations.items():
        quantities[kind] = {
            name: solution.weights(combination) @ solution.gain
            for name, combination in named.items()
        }
    for kind, weights in quantities.items():
        for one in correlations_of(solution.model, weights):
            yield CorrelationResult(
                kind=kind,
                first=one.first,
                second=one.second,
                coefficient=one.coefficient,
                parts=one.parts,
            )


def closure_results(means: Sequence[SessionMean], model: LinearModel) -> Iterator[ClosureResult]:
    """Loops of clocks with their verdicts, from a model without excess scatter."""
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
