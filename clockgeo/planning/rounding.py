"""Whole days from a continuous optimum: fill up step by step, then exchange."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from clockgeo.planning.design_problem import Array, DesignProblem, State

__all__ = ["round_to_steps"]

_TRIED = 12
"""Candidates on each side that an exchange looks at, by their slopes."""
_EXCHANGES = 500
_TRIMS = 2000
_TRACE = 1e-9
_MEAN_SHARE = 0.03
_NOTHING = 0.02
"""Share of a step below which a continuous time counts as none."""

Allowed = Callable[[Array], bool]


def round_to_steps(
    problem: DesignProblem, w: Array, step: float, *, allowed: Allowed | None = None
) -> Array:
    """Round an allocation to whole steps.

    Parameters
    ----------
    problem : DesignProblem
    w : float array, shape (n,)
        Continuous optimum.
    step : float
        Times become multiples of it.
    allowed : callable, optional
        Says of an allocation whether it may be the answer (a budget with fixed costs, control).

    Returns
    -------
    float array, shape (n,)

    Notes
    -----
    Rounded down, then filled up where a step helps most, then exchanged one step for another while
    that helps (in the manner of Fedorov 1972, Theory of Optimal Experiments). A local optimum; how
    far it can be from the best is told by the bound of the continuous problem.
    """
    may = allowed or (lambda _: True)
    least = np.ceil(problem.least / step - 1e-9) * step
    whole = np.floor(w / step + 1e-6) * step
    if allowed is not None:
        # Short sessions may be what controls the others: they get a step rather than none.
        whole = np.where(w > _NOTHING * step, np.ceil(w / step - 1e-6) * step, 0.0)
    whole = _trimmed(problem, np.maximum(whole, least), step, least, may)
    whole = _filled(problem, whole, step, may)
    nearest = _filled(problem, _nearest(problem, w, step, least), step, may)
    found = [_exchanged(problem, start, step, least, may) for start in (whole, nearest)]
    return min(found, key=lambda one: (not may(one), problem.value(one))) + 0.0  # no minus zero


def _nearest(problem: DesignProblem, w: Array, step: float, least: Array) -> Array:
    """Rounded to the nearest step, from the largest down, while the budget lasts."""
    whole = least.copy()
    for k in np.argsort(-w, kind="stable").tolist():
        wanted = max(round(float(w[k]) / step) * step, float(least[k]))
        left = problem.budget - float(problem.cost @ whole)
        extra = (wanted - float(least[k])) * float(problem.cost[k])
        if extra <= left + 1e-9 and wanted <= problem.most[k] + 1e-9:
            whole[k] = wanted
    return whole


def _exchanged(problem: DesignProblem, w: Array, step: float, least: Array, may: Allowed) -> Array:
    """Exchange steps while that helps."""
    for _ in range(_EXCHANGES):
        better = _exchange(problem, w, step, least, may)
        if better is None:
            break
        w = better
    return w


def _room(problem: DesignProblem, w: Array, step: float) -> Array:
    """Where one more step fits."""
    left = problem.budget - float(problem.cost @ w)
    fits = (w + step <= problem.most + 1e-9) & (problem.cost * step <= left + 1e-9)
    return np.asarray(fits)


def _state(problem: DesignProblem, w: Array) -> State:
    """State with a trace of time everywhere: whole steps may leave something undetermined."""
    return State(problem, w + _TRACE * problem.budget / problem.cost.clip(min=1e-12))


def _mean_share(problem: DesignProblem) -> float:
    """A little of the mean leads off the plateaus of maxima."""
    return _MEAN_SHARE if problem.criterion in ("worst", "E") else 0.0


def _filled(problem: DesignProblem, w: Array, step: float, may: Allowed) -> Array:
    """Add steps where they help most, while the budget lasts."""
    share = _mean_share(problem)
    while np.any(fits := _room(problem, w, step)):
        state = _state(problem, w)
        tried = [
            (state.value_after({k: step}, mean_share=share), k)
            for k in np.flatnonzero(fits).tolist()
            if may(w + step * _unit(w, k))
        ]
        if not tried:
            break
        w = w + step * _unit(w, min(tried)[1])
    return w


def _slope(problem: DesignProblem, state: State) -> Array:
    """Slope of the criterion; of the largest of the variances where there are several."""
    weights = np.eye(len(state.v))
    if problem.criterion == "D":
        weights = np.asarray(np.linalg.inv(state.v))
    elif problem.criterion == "E":
        vector = np.linalg.eigh(state.v)[1][:, -1]
        weights = np.outer(vector, vector)
    elif problem.criterion == "worst":
        variance = np.diag(state.v)
        weights = np.diag((variance / variance.max()) ** 8)
    return state.weighted_slope(weights)


def _unit(w: Array, k: int) -> Array:
    unit = np.zeros_like(w)
    unit[k] = 1.0
    return unit


def _trimmed(problem: DesignProblem, w: Array, step: float, least: Array, may: Allowed) -> Array:
    """Take steps away until the budget is kept and the allocation is allowed, if it can be."""
    for _ in range(_TRIMS):
        if float(problem.cost @ w) <= problem.budget + 1e-9 and may(w):
            break
        state = _state(problem, w)
        givers = np.flatnonzero(w - step >= least - 1e-9).tolist()
        kept = [k for k in givers if may(w - step * _unit(w, k))] or givers
        if not kept:
            break
        w = w - step * _unit(w, min((state.value_after({k: -step}), k) for k in kept)[1])
    return w


def _exchange(
    problem: DesignProblem, w: Array, step: float, least: Array, may: Allowed
) -> Array | None:
    """The best exchange of a step among the most promising ones; None where none helps."""
    share, state = _mean_share(problem), _state(problem, w)
    slope = _slope(problem, state)
    takers = [k for k in np.argsort(slope).tolist() if w[k] + step <= problem.most[k] + 1e-9]
    givers = [k for k in np.argsort(-slope).tolist() if w[k] - step >= least[k] - 1e-9]
    here = state.value_after({}, mean_share=share)
    best, value = None, here - 1e-12 * abs(here)
    for k in givers[:_TRIED]:
        for j in takers[:_TRIED]:
            moved = w + step * (_unit(w, j) - _unit(w, k))
            if j == k or float(problem.cost @ moved) > problem.budget + 1e-9:
                continue
            found = state.value_after({j: step, k: -step}, mean_share=share)
            if found < value and may(moved):
                best, value = moved, found
    return best
