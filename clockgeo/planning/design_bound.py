"""The certificate of a design: a value that no feasible allocation can be below."""

from __future__ import annotations

import numpy as np

from clockgeo.planning.design_problem import Array, DesignProblem, State

__all__ = ["lower_bound"]


def lower_bound(
    problem: DesignProblem, state: State, w: Array, *, weights: Array, multipliers: Array
) -> float:
    """Value that no feasible allocation can be below.

    Parameters
    ----------
    problem : DesignProblem
    state : State
        At w.
    w : float array, shape (n,)
    weights : float array, shape (t, t)
        W of unit trace for the worst variance and E; ignored otherwise.
    multipliers : float array, shape (r,)
        Of the further constraints, >= 0; any are valid, good ones make the bound tight.

    Notes
    -----
    Convexity: φ(s) >= φ(w) + φ'(w)·(s - w); for maxima over W, with tr(W V) in place of φ. The
    linear part is minimised exactly over the bounds and the budget (a fractional knapsack), with
    the further constraints in Lagrange's form.
    """
    name = problem.criterion
    if name == "D":
        value, slope = state.value, state.weighted_slope(np.asarray(np.linalg.inv(state.v)))
    elif name == "A":
        value, slope = state.value, state.weighted_slope(np.eye(len(state.v)))
    else:
        value, slope = float(np.sum(weights * state.v)), state.weighted_slope(weights)
    tilted = slope + multipliers @ problem.more
    least = _cheapest(problem, tilted)
    return float(value - slope @ w + least - multipliers @ problem.limit)


def _cheapest(problem: DesignProblem, slope: Array) -> float:
    """Minimum of slope·s over the bounds and the budget."""
    left = problem.budget - float(problem.cost @ problem.least)
    total = float(slope @ problem.least)
    with np.errstate(divide="ignore"):
        order = np.argsort(slope / problem.cost, kind="stable")
    for k in order.tolist():
        if slope[k] >= 0.0:
            continue
        taken = float(problem.most[k] - problem.least[k])
        if problem.cost[k] > 0.0:
            taken = min(taken, left / float(problem.cost[k]))
        total += float(slope[k]) * taken
        left -= float(problem.cost[k]) * taken
    return total
