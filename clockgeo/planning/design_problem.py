"""Optimal design: how information grows with the time given to each observation.

    M(w) = M0 + Σ w_k s_k a_k a_kᵀ,      V(w) = Cᵀ M(w)⁻¹ C

w are the times, s_k the information that row a_k brings in a unit of time, M0 what is known in any
case. Floors and effects that observations share are further unknowns with a prior in M0, so that M
stays linear in w and every criterion below convex (Pukelsheim 1993, Optimal Design of Experiments;
Boyd and Vandenberghe 2004, Convex Optimization, section 7.5).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy import linalg

__all__ = ["Criterion", "DesignProblem", "State"]

Criterion = Literal["worst", "A", "D", "E"]
"""Largest diagonal element, trace, ln of the determinant, or largest eigenvalue of V."""

Array = NDArray[np.float64]
_SINGULAR = 1e-9
"""Share of the information below which nothing is left of it."""


@dataclass(frozen=True, eq=False)
class DesignProblem:
    """A convex problem of design.

    Attributes
    ----------
    rows : float array, shape (n, m)
        a_k.
    rate : float array, shape (n,)
        s_k, > 0.
    known : float array, shape (m, m)
        M0, positive semidefinite.
    wanted : float array, shape (m, t)
        C.
    criterion : Criterion
    cost : float array, shape (n,)
        Of a unit of time, > 0 or with a finite `most`.
    budget : float
        Σ cost_k w_k is at most this.
    least, most : float arrays, shape (n,)
        Bounds of w, least < most; most may be infinite.
    more, limit : float arrays, shapes (r, n), (r,)
        Further constraints: more w <= limit.
    """

    rows: Array
    rate: Array
    known: Array
    wanted: Array
    criterion: Criterion
    cost: Array
    budget: float
    least: Array
    most: Array
    more: Array
    limit: Array

    @classmethod
    def of(
        cls,
        rows: Array,
        rate: Array,
        wanted: Array,
        criterion: Criterion,
        *,
        budget: float = 1.0,
        known: Array | None = None,
        cost: Array | None = None,
        least: Array | None = None,
        most: Array | None = None,
    ) -> DesignProblem:
        """Make a problem with plain defaults: nothing known, unit costs, no bounds but zero."""
        n, m = rows.shape
        return cls(
            rows=rows,
            rate=rate,
            known=np.zeros((m, m)) if known is None else known,
            wanted=wanted,
            criterion=criterion,
            cost=np.ones(n) if cost is None else cost,
            budget=budget,
            least=np.zeros(n) if least is None else least,
            most=np.full(n, np.inf) if most is None else most,
            more=np.zeros((0, n)),
            limit=np.zeros(0),
        )

    def constrained(self, more: Array, limit: Array) -> DesignProblem:
        """Return the problem with further constraints."""
        return replace(
            self, more=np.vstack([self.more, more]), limit=np.concatenate([self.limit, limit])
        )

    def value(self, w: Array) -> float:
        """Criterion at w; infinite where something wanted is not determined."""
        try:
            return State(self, w).value
        except linalg.LinAlgError:
            return float("inf")


class State:
    """Everything that the criteria need at one w.

    Raises LinAlgError where M(w) is singular.

    Attributes
    ----------
    v : float array, shape (t, t)
        V(w).
    seen : float array, shape (t, n)
        Cᵀ M⁻¹ a_k in columns.
    """

    def __init__(self, problem: DesignProblem, w: Array) -> None:
        self.problem = problem
        information = problem.known + (problem.rows.T * (w * problem.rate)) @ problem.rows
        diagonal = np.diag(information)
        if not np.all(diagonal > 0.0):
            message = "an unknown is not seen at all"
            raise linalg.LinAlgError(message)
        scale = 1.0 / np.sqrt(diagonal)
        factor = linalg.cho_factor(information * np.outer(scale, scale), lower=True)
        lower = np.tril(factor[0])
        self._rows = linalg.solve_triangular(lower, (problem.rows * scale).T, lower=True)
        wanted = linalg.solve_triangular(lower, problem.wanted * scale[:, None], lower=True)
        self.v = wanted.T @ wanted
        self.seen = wanted.T @ self._rows

    def between(self) -> Array:
        """a_kᵀ M⁻¹ a_l, shape (n, n)."""
        return np.asarray(self._rows.T @ self._rows)

    @property
    def value(self) -> float:
        """The criterion."""
        return self._criterion(self.v)

    def value_after(self, changes: Mapping[int, float], *, mean_share: float = 0.0) -> float:
        """Criterion after the times of a few rows have changed; infinite where V has no bound.

        Parameters
        ----------
        changes : mapping of int to float
            Row -> change of its time.
        mean_share : float
            Share of the mean variance that is added.

        Notes
        -----
        Sherman, Morrison and Woodbury: with S the diagonal of the changes of information and B, G
        the columns and the block of the changed rows, V' = V - B (S⁻¹ + G)⁻¹ Bᵀ.
        """
        rows = [k for k, change in changes.items() if change]
        size = np.array([changes[k] for k in rows]) * self.problem.rate[rows]
        within = self._rows[:, rows].T @ self._rows[:, rows]
        inner = np.eye(len(rows)) + within * size
        if np.linalg.det(inner) <= _SINGULAR:
            return float("inf")
        seen = self.seen[:, rows]
        v = self.v - (seen * size) @ np.linalg.solve(inner, seen.T)
        return self._criterion(v) + mean_share * float(np.mean(np.diag(v)))

    def _criterion(self, v: Array) -> float:
        name = self.problem.criterion
        if name == "A":
            return float(np.trace(v))
        if name == "D":
            return float(np.linalg.slogdet(v)[1])
        if name == "E":
            return float(np.linalg.eigvalsh((v + v.T) / 2.0)[-1])
        return float(np.max(np.diag(v)))

    def weighted_slope(self, weights: Array) -> Array:
        """Derivative of tr(W V) with respect to w, shape (n,)."""
        return np.asarray(
            -self.problem.rate * np.einsum("ik,ij,jk->k", self.seen, weights, self.seen)
        )
