"""The adjustment of a height network: best linear unbiased numbers, terms and effects.

The estimates are those of `levelling.solve`; here the effects are unknowns of unit prior, so that
nets of a million points stay sparse, what is not determined gets infinite u while the rest is
solved, and the zero level can be defined by known numbers, by the mean of sites or freely.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.solution import Contribution, Fit, Solution
from clockgeo.network.identifiability import Identifiability, identify
from clockgeo.network.normal_equations import NormalEquations, normal_equations
from clockgeo.network.whitening import WhitenedSystem, whiten
from clockgeo.network.zero_definition import ZeroDefinition, ZeroRule, define_zero

__all__ = ["Adjustment", "adjust_network"]

Combination = Mapping[Any, float]


@dataclass(frozen=True, eq=False)
class Adjustment:
    """Estimates of everything in a `LinearModel`.

    Attributes
    ----------
    model : LinearModel
    identifiability : Identifiability
        What the rows determine.
    zero : ZeroDefinition
        What the zero level hangs on.
    system : WhitenedSystem
    normals : NormalEquations
    estimate : float array, shape (p,)
        The unknowns; NaN where not estimable.
    effects : float array, shape (q,)
        Estimates of the standardised effects that more than one row feels; 0 for the others.
    residuals : float array, shape (n,)
        Observed minus adjusted, effects included in the adjusted value; m² s⁻².
    fit : Fit
        Global test.
    """

    model: LinearModel
    identifiability: Identifiability
    zero: ZeroDefinition
    system: WhitenedSystem
    normals: NormalEquations
    estimate: NDArray[np.float64]
    effects: NDArray[np.float64]
    residuals: NDArray[np.float64]
    fit: Fit

    @cached_property
    def place(self) -> dict[Hashable, int]:
        """Unknown -> its place in `estimate`."""
        return {name: i for i, name in enumerate(self.model.unknowns)}

    @cached_property
    def u_of_unknowns(self) -> NDArray[np.float64]:
        """Standard uncertainty of every unknown, shape (p,); infinite where not estimable."""
        variance = np.zeros(len(self.model.unknowns))
        free = self.system.free
        variance[free] = self.normals.diagonal()[: free.size]
        variance = self.zero.diagonal(variance)
        u = np.sqrt(np.maximum(variance, 0.0))
        u[self.zero.open_unknowns] = np.inf
        return u

    def weights(self, combination: Combination) -> NDArray[np.float64]:
        """Coefficients of a combination as a vector of shape (p,); absent names count as known."""
        vector = np.zeros(len(self.model.unknowns))
        for name, coefficient in combination.items():
            if name in self.place:
                vector[self.place[name]] += coefficient
        return vector

    def estimable(self, combination: Combination) -> bool:
        """Whether the observations determine a combination of unknowns."""
        return self.zero.sees(self.weights(combination))

    def value(self, combination: Combination) -> float:
        """Estimate of a combination of unknowns; NaN if not estimable."""
        weights = self.weights(combination)
        if not self.zero.sees(weights):
            return float("nan")
        used = weights != 0.0
        return float(weights[used] @ self.zero.solution[used])

    def u(self, combination: Combination) -> float:
        """Standard uncertainty of a combination of unknowns; infinite if not estimable."""
        if not self.estimable(combination):
            return float("inf")
        return float(np.sqrt(max(self.covariance([combination])[0, 0], 0.0)))

    def covariance(self, combinations: Sequence[Combination]) -> NDArray[np.float64]:
        """Covariance of combinations, shape (m, m); NaN where one is not estimable."""
        plain = [self.weights(one) for one in combinations]
        weights = np.array([self.zero.pull_back(one) for one in plain])
        free = self.system.free
        right = np.zeros((self.system.design.shape[1], len(plain)))
        right[: free.size] = weights[:, free].T
        found = weights[:, free] @ self.normals.solve(right)[: free.size]
        blind = np.array([not self.zero.sees(one) for one in plain])
        found[blind, :], found[:, blind] = np.nan, np.nan
        return np.asarray((found + found.T) / 2.0)

    def gain(self, combination: Combination) -> NDArray[np.float64]:
        """Weight of every observation in a combination, shape (n,)."""
        weights = self.zero.pull_back(self.weights(combination))
        free = self.system.free
        right = np.zeros(self.system.design.shape[1])
        right[: free.size] = weights[free]
        in_rows = self.system.design @ self.normals.solve(right)
        gain = self.system.whitener.T @ in_rows[: len(self.model.rows)]
        # A fixed unknown takes its value from its row, and so does what others owe to it.
        through = weights - self.model.design.T @ gain
        for row, column in self.system.fixed.items():
            gain[row] = through[column] / self.model.design[row, column]
        return np.asarray(gain)

    def contributions(self, combination: Combination) -> list[Contribution]:
        """Split the uncertainty of a combination by effect (signed, noise not included)."""
        loads = self.gain(combination) @ self.model.loading
        return [
            Contribution(effect, float(load))
            for effect, load in zip(self.model.effects, loads, strict=True)
        ]

    def noise_u(self, combination: Combination, kind: str | None = None) -> float:
        """Part of the uncertainty that comes from the noise of observations (of one `kind`)."""
        gain = self.gain(combination)
        if kind is not None:
            gain = np.where(np.array(self.model.kinds) == kind, gain, 0.0)
        return float(np.sqrt(max(float(gain @ (self.model.noise @ gain)), 0.0)))

    def solution_for(self, names: Sequence[Hashable]) -> Solution:
        """Part of the adjustment as a `Solution` of some unknowns alone.

        Raises
        ------
        DataError
            If one of them is not estimable.
        """
        for name in names:
            if not self.estimable({name: 1.0}):
                raise DataError("not estimable from these observations", value=name)
        columns = [self.place[name] for name in names]
        return Solution(
            model=replace(self.model, unknowns=tuple(names), design=self.model.design[:, columns]),
            estimate=self.estimate[columns],
            covariance=self.covariance([{name: 1.0} for name in names]),
            gain=np.array([self.gain({name: 1.0}) for name in names]),
            residuals=self.residuals,
            fit=self.fit,
        )


def adjust_network(
    model: LinearModel,
    *,
    zero: ZeroRule | None = None,
    method: Literal["auto", "dense", "sparse"] = "auto",
    row_weights: NDArray[np.float64] | None = None,
    known: Identifiability | None = None,
) -> Adjustment:
    """Adjust a network.

    Parameters
    ----------
    model : LinearModel
    zero : ZeroRule, optional
        What the zero level hangs on; known numbers among the rows if not given.
    method : {"auto", "dense", "sparse"}
        How the normal equations are solved; by size if "auto".
    row_weights : float array, shape (n,), optional
        Factors of the rows' weights, as a robust estimation sets them.
    known : Identifiability, optional
        What the rows determine, where that was found before.

    Returns
    -------
    Adjustment

    Raises
    ------
    DataError
        If there is no row, a row has no noise of its own, or the zero level is defined twice.

    Notes
    -----
    Unknowns that are not determined are held one by one (one a direction of the null space), which
    changes no estimable combination; a zero level that is not known is then moved to where the rule
    says by an S-transformation (Baarda 1973, S-transformations and criterion matrices).
    """
    if not model.rows:
        raise DataError("there is nothing to adjust", advice="Add observations")
    known = identify(model) if known is None else known
    system = whiten(model, held=known.null_space.pivots, row_weights=row_weights)
    dense = {"auto": None, "dense": True, "sparse": False}[method]
    normals = normal_equations(system.design, dense=dense)
    solved = normals.solve(system.design.T @ system.values)
    free, common = system.free, system.common
    held = system.known.copy()
    held[free] = solved[: free.size]
    effects = np.zeros(len(model.effects))
    effects[common] = solved[free.size :]
    definition = define_zero(model, known, zero, held, system, normals)
    misfit = system.values - system.design @ solved
    return Adjustment(
        model=model,
        identifiability=known,
        zero=definition,
        system=system,
        normals=normals,
        estimate=np.where(definition.open_unknowns, np.nan, definition.solution),
        effects=effects,
        residuals=model.values - model.design @ held - model.loading @ effects,
        fit=_fit(float(misfit @ misfit), system, row_weights),
    )


def _fit(
    chi_squared: float, system: WhitenedSystem, row_weights: NDArray[np.float64] | None
) -> Fit:
    left_out = 0 if row_weights is None else int(np.count_nonzero(row_weights == 0.0))
    freedom = system.degrees_of_freedom - left_out
    if freedom <= 0:
        return Fit(0.0, freedom, None)
    return Fit(chi_squared, freedom, float(stats.chi2.sf(chi_squared, freedom)))
