"""The constraints of a design, and a point strictly inside them to start from."""

from __future__ import annotations

import numpy as np

from clockgeo.errors import DataError
from clockgeo.planning.design_problem import Array, DesignProblem

__all__ = ["constraints_of", "interior_point"]


def constraints_of(problem: DesignProblem) -> tuple[Array, Array]:
    """All constraints as Z w <= z; the further ones of the problem stand last."""
    n = problem.rate.size
    bounded = np.isfinite(problem.most)
    z = np.vstack([-np.eye(n), np.eye(n)[bounded], problem.cost[None, :], problem.more])
    limit = np.concatenate([-problem.least, problem.most[bounded], [problem.budget], problem.limit])
    return z, limit


def interior_point(problem: DesignProblem) -> Array:
    """Return a point strictly inside all constraints.

    Raises
    ------
    DataError
        If there is none.
    """
    cost = np.maximum(problem.cost, 1e-12)
    room = np.minimum(problem.most - problem.least, problem.budget / cost)
    left = problem.budget - float(problem.cost @ problem.least)
    share = left / max(float(problem.cost @ room), 1e-300)
    if share > 0.0:
        w = problem.least + room * min(0.5, 0.5 * share)
        if np.all(problem.more @ w < problem.limit):
            return np.asarray(w)
    return _most_central(problem)


def _most_central(problem: DesignProblem) -> Array:
    """The point whose smallest slack is largest, by linear programming."""
    from scipy.optimize import linprog

    z, limit = constraints_of(problem)
    n = problem.rate.size
    found = linprog(
        np.append(np.zeros(n), -1.0),
        A_ub=np.hstack([z, np.ones((len(z), 1))]),
        b_ub=limit,
        bounds=[(None, None)] * n + [(None, 1.0)],
    )
    if found.status != 0 or found.x is None or found.x[-1] <= 1e-9:
        raise DataError(
            "the candidates' bounds, the days and the wish for control leave no room",
            advice="Give more days, lower least_days, or add candidates",
        )
    return np.asarray(found.x[:n])
