"""The best allocation of time, by a primal-dual interior-point method, with a bound that proves it.

The problem is to minimise φ(w) = tr V or ln det V, or t with V <= t I (E) or diag V <= t (worst),
under linear constraints Z w <= z. With slacks f = z - Z w and F, multipliers λ and W, each step
solves the linearised conditions of optimality, F = t I - V, λ f = μ and W F = μ I, for a falling μ.
F is a variable of its own, so that the curvature of V does not shorten the steps.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import linalg

from clockgeo.planning.design_bound import lower_bound
from clockgeo.planning.design_problem import Array, DesignProblem, State
from clockgeo.planning.interior_point import constraints_of, interior_point

__all__ = ["Optimum", "optimise"]

_ITERATIONS = 150
_CENTRING = 0.15
"""By how much the complementarity shall fall in a step."""
_INTERIOR = 0.98
"""Share of the way to the nearest boundary that a step may go."""
_HALVINGS = 30


@dataclass(frozen=True, eq=False)
class Optimum:
    """An allocation and how far from the best it can be at most.

    Attributes
    ----------
    w : float array, shape (n,)
    value : float
        Criterion at w.
    bound : float
        No feasible allocation has a smaller one.
    gap : float
        value/bound - 1; for D, value - bound (of the logarithm).
    evaluations : int
        How often the information matrix was factorised.
    """

    w: Array
    value: float
    bound: float
    gap: float
    evaluations: int


def optimise(problem: DesignProblem, *, gap: float = 1e-9) -> Optimum:
    """Minimise the criterion over all feasible allocations.

    Parameters
    ----------
    problem : DesignProblem
    gap : float
        Wanted certificate gap.

    Returns
    -------
    Optimum
        Its gap may stay above the wanted one where rounding does not let it fall further.

    Raises
    ------
    DataError
        If the constraints leave no room.

    Notes
    -----
    Boyd and Vandenberghe 2004, Convex Optimization, section 11.7, with a matrix multiplier for E
    (Helmberg, Rendl, Vanderbei and Wolkowicz 1996, SIAM J. Optim. 6, 342; from memory). The bound
    of every step is that of `lower_bound`, and holds whatever the multipliers.
    """
    path = _Path(problem, interior_point(problem))
    best = path.assess()
    for _ in range(_ITERATIONS):
        if best.gap <= gap or not path.step():
            break
        found = path.assess()
        if found.gap < best.gap:
            best = found
    return best


class _Path:
    """A point with its multipliers on the way to the optimum."""

    def __init__(self, problem: DesignProblem, w: Array) -> None:
        self.problem = problem
        self._z, self._limit = constraints_of(problem)
        self._lifted = problem.criterion in ("worst", "E")
        self.evaluations = 1
        state = State(problem, w)
        self._scale = 1.0 if problem.criterion == "D" else state.value
        size, slack = len(state.v), self._limit - self._z @ w
        self._point = _Point(
            w=w,
            t=2.0 * state.value / self._scale,
            room=np.eye(size),
            weights=np.eye(size) / (size if self._lifted else 1.0),
            multipliers=1.0 / (slack.size * slack),
            state=state,
        )

    def assess(self) -> Optimum:
        """Value, bound and gap at the point."""
        problem, here = self.problem, self._point
        weights = here.weights / np.trace(here.weights)
        further = here.multipliers[here.multipliers.size - problem.limit.size :] * self._scale
        bound = lower_bound(problem, here.state, here.w, weights=weights, multipliers=further)
        value = here.state.value
        if problem.criterion == "D":
            gap = value - bound
        else:
            gap = value / bound - 1.0 if bound > 0.0 else float("inf")
        return Optimum(here.w.copy(), value, bound, max(gap, 0.0), self.evaluations)

    def step(self) -> bool:
        """Go one step; false where none makes progress."""
        here = self._point
        mu = _CENTRING * self._complementarity(here)
        change = self._direction(here, mu)
        slack = self._limit - self._z @ here.w
        length = min(
            1.0,
            _reach(slack, -self._z @ change.w),
            _reach(here.multipliers, change.multipliers),
        )
        if self._lifted:
            length = min(length, _matrix_reach(here.room, change.room))
            length = min(length, _matrix_reach(here.weights, change.weights))
        size = self._residual(here, mu)
        for _ in range(_HALVINGS):
            there = self._moved(change, length)
            if there is not None and self._residual(there, mu) <= (1.0 - 0.01 * length) * size:
                self._point = there
                return True
            length *= 0.5
        return False

    def _moved(self, change: _Change, length: float) -> _Point | None:
        here = self._point
        w = here.w + length * change.w
        self.evaluations += 1
        try:
            state = State(self.problem, w)
        except linalg.LinAlgError:
            return None
        return _Point(
            w=w,
            t=here.t + length * change.t,
            room=here.room + length * change.room,
            weights=here.weights + length * change.weights,
            multipliers=here.multipliers + length * change.multipliers,
            state=state,
        )

    def _variances(self, state: State) -> Array:
        """V in units of its start, or its diagonal part for the worst variance."""
        v = state.v / self._scale
        return np.diag(np.diag(v)) if self.problem.criterion == "worst" else v

    def _missing(self, at: _Point) -> Array:
        """F + V - t I, which is zero at the end."""
        return np.asarray(at.room + self._variances(at.state) - at.t * np.eye(len(at.room)))

    def _complementarity(self, at: _Point) -> float:
        slack = self._limit - self._z @ at.w
        total, count = float(at.multipliers @ slack), slack.size
        if self._lifted:
            total, count = total + float(np.sum(at.weights * at.room)), count + len(at.room)
        return total / count

    def _slope_weights(self, at: _Point) -> Array:
        """W that makes the slope of the criterion that of tr(W V)."""
        if self.problem.criterion == "D":
            return np.asarray(np.linalg.inv(at.state.v))
        return at.weights

    def _residual(self, at: _Point, mu: float) -> float:
        """Size of what is missing to the conditions of optimality."""
        slack = self._limit - self._z @ at.w
        slope = at.state.weighted_slope(self._slope_weights(at)) / self._scale
        dual = slope + self._z.T @ at.multipliers
        parts = [dual * np.abs(at.w), at.multipliers * slack - mu]
        if self._lifted:
            parts.append(np.atleast_1d(1.0 - np.trace(at.weights)))
            product = at.weights @ at.room
            parts.append(((product + product.T) / 2.0 - mu * np.eye(len(product))).ravel())
            parts.append(self._missing(at).ravel() / len(product))
        return float(np.linalg.norm(np.concatenate(parts)))

    def _direction(self, at: _Point, mu: float) -> _Change:
        """Solution of the linearised conditions of optimality."""
        n, rate, criterion = at.w.size, self.problem.rate, self.problem.criterion
        slack = self._limit - self._z @ at.w
        weights = self._slope_weights(at)
        seen = at.state.seen / np.sqrt(self._scale)
        pairs = seen.T @ weights @ seen
        rates = np.outer(rate, rate)
        curve = 2.0 * at.state.between() * pairs
        matrix = self._z.T @ ((at.multipliers / slack)[:, None] * self._z)
        barrier = self._z.T @ (mu / slack)
        if not self._lifted:
            if criterion == "D":
                curve = curve - pairs**2
            step = _solved(matrix + rates * curve, barrier - rate * np.diag(pairs))
            return self._change(at, step, 0.0, np.zeros_like(weights), weights * 0.0, mu)
        inverse = np.linalg.inv(at.room)
        missing = self._missing(at)
        target = mu * inverse + _symmetric(weights @ missing @ inverse)
        if criterion == "worst":
            squares, ratio = seen**2, np.diag(weights) * np.diag(inverse)
            curve = curve + squares.T @ (ratio[:, None] * squares)
            cross, aim = squares.T @ ratio, squares.T @ np.diag(target)
        else:
            curve = curve + pairs * (seen.T @ inverse @ seen)
            cross = np.einsum("ik,ij,jk->k", seen, _symmetric(inverse @ weights), seen)
            aim = np.einsum("ik,ij,jk->k", seen, target, seen)
        whole = np.empty((n + 1, n + 1))
        whole[:n, :n] = matrix + rates * curve
        whole[n, :n] = whole[:n, n] = rate * cross
        whole[n, n] = float(np.sum(weights * inverse))
        step = _solved(whole, np.append(barrier - rate * aim, 1.0 - float(np.trace(target))))
        room = step[n] * np.eye(len(inverse)) + (seen * (rate * step[:n])) @ seen.T - missing
        if criterion == "worst":
            room = np.diag(np.diag(room))
        turned = mu * inverse - weights - _symmetric(weights @ room @ inverse)
        return self._change(at, step[:n], float(step[n]), room, turned, mu)

    def _change(
        self, at: _Point, w: Array, t: float, room: Array, weights: Array, mu: float
    ) -> _Change:
        slack = self._limit - self._z @ at.w
        multipliers = mu / slack - at.multipliers * (1.0 - self._z @ w / slack)
        return _Change(w=w, t=t, room=room, weights=weights, multipliers=multipliers)


@dataclass(frozen=True, eq=False)
class _Change:
    """Times, t, F, W and λ, or their changes."""

    w: Array
    t: float
    room: Array
    weights: Array
    multipliers: Array


@dataclass(frozen=True, eq=False)
class _Point(_Change):
    """With the information matrix factorised there."""

    state: State


def _symmetric(matrix: Array) -> Array:
    return (matrix + matrix.T) / 2.0


def _solved(matrix: Array, slope: Array) -> Array:
    """Return -matrix⁻¹ slope, scaled to unit diagonal first."""
    size = np.sqrt(np.maximum(np.diag(matrix), 1e-300))
    scaled = matrix / np.outer(size, size)
    try:
        return np.asarray(-linalg.cho_solve(linalg.cho_factor(scaled), slope / size) / size)
    except linalg.LinAlgError:
        return np.asarray(-np.linalg.lstsq(scaled, slope / size, rcond=1e-13)[0] / size)


def _reach(values: Array, change: Array) -> float:
    """How far positive values may change before one is nearly zero."""
    falling = change < 0.0
    if not np.any(falling):
        return 1.0
    return float(_INTERIOR * np.min(values[falling] / -change[falling]))


def _matrix_reach(matrix: Array, change: Array) -> float:
    """The same for a positive definite matrix."""
    root = np.linalg.cholesky(matrix)
    inner = linalg.solve_triangular(root, change, lower=True)
    inner = linalg.solve_triangular(root, inner.T, lower=True)
    lowest = float(np.linalg.eigvalsh((inner + inner.T) / 2.0)[0])
    return 1.0 if lowest >= 0.0 else min(1.0, _INTERIOR / -lowest)
