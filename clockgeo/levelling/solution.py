"""Best linear unbiased solution of a `LinearModel`, with everything that is said about it later.

The covariance of the observations may be singular: three ratios formed from the same three clocks
have a covariance of rank two, and the third is the same information again. The solution therefore
follows Rao's unified theory of least squares with T = V + A U Aᵀ (C. R. Rao 1973, Linear
Statistical Inference and its Applications, 2nd ed., section 4i), which needs no inverse of V and
counts a redundant observation as nothing. Dense; meant for up to a few thousand observations.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, stats

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel

__all__ = ["Combination", "Contribution", "Fit", "Solution", "null_space", "solve"]

Combination = Mapping[Any, float]
"""A linear combination of unknowns: name of the unknown -> coefficient."""

_ROUNDING = 1e-8
"""m² s⁻²: what arithmetic alone may leave of a number of some 10⁵ m² s⁻²."""
_RANK_TOLERANCE = 1e-9
"""Relative size below which a singular value of a scaled matrix counts as zero."""


@dataclass(frozen=True)
class Fit:
    """How well the observations fit: vᵀ V⁺ v, its degrees of freedom and upper-tail probability."""

    chi_squared: float
    degrees_of_freedom: int
    p_value: float | None


@dataclass(frozen=True)
class Contribution:
    """Part `u` (m² s⁻², with the sign of its weight) of one effect in a combination of unknowns."""

    effect: Hashable
    u: float


@dataclass(frozen=True, eq=False)
class Solution:
    """Estimates and their covariance.

    Attributes
    ----------
    model : LinearModel
        What was solved.
    estimate : float array, shape (p,)
        The unknowns in m² s⁻², in the order of `model.unknowns`.
    covariance : float array, shape (p, p)
        Their covariance in m⁴ s⁻⁴.
    gain : float array, shape (p, n)
        G with estimate = G l; the weight of every observation in every unknown.
    residuals : float array, shape (n,)
        Observed minus adjusted, in m² s⁻².
    fit : Fit
        Global test of the residuals.
    """

    model: LinearModel
    estimate: NDArray[np.float64]
    covariance: NDArray[np.float64]
    gain: NDArray[np.float64]
    residuals: NDArray[np.float64]
    fit: Fit

    @cached_property
    def _place(self) -> dict[Hashable, int]:
        return {name: i for i, name in enumerate(self.model.unknowns)}

    @property
    def residual_of(self) -> dict[str, float]:
        """Observation -> observed minus adjusted, m² s⁻²."""
        return dict(zip(self.model.rows, self.residuals.tolist(), strict=True))

    def weights(self, combination: Combination) -> NDArray[np.float64]:
        """Coefficients of a combination of unknowns as a vector of shape (p,); absent ones are 0.

        A name that is not an unknown of the model is taken as known without error (the fixed
        reference), and contributes nothing.
        """
        vector = np.zeros(len(self.model.unknowns))
        for name, coefficient in combination.items():
            if name in self._place:
                vector[self._place[name]] += coefficient
        return vector

    def value(self, combination: Combination) -> float:
        """Estimate of a linear combination of unknowns in m² s⁻²."""
        return float(self.weights(combination) @ self.estimate)

    def u(self, combination: Combination) -> float:
        """Standard uncertainty of a linear combination of unknowns in m² s⁻²."""
        weights = self.weights(combination)
        return _root(weights @ self.covariance @ weights)

    def contributions(self, combination: Combination) -> list[Contribution]:
        """Split the uncertainty of a combination by effect (signed, noise not included)."""
        loads = (self.weights(combination) @ self.gain) @ self.model.loading
        return [
            Contribution(effect, float(load))
            for effect, load in zip(self.model.effects, loads, strict=True)
        ]

    def noise_u(self, combination: Combination, kind: str | None = None) -> float:
        """Part of the uncertainty that comes from the noise of observations (of one `kind`)."""
        weights = self.weights(combination) @ self.gain
        if kind is not None:
            weights = np.where(np.array(self.model.kinds) == kind, weights, 0.0)
        return _root(weights @ (self.model.noise @ weights))


def _root(variance: Any) -> float:
    """Square root of a variance that rounding may have put just below zero."""
    return float(np.sqrt(max(float(variance), 0.0)))


def null_space(model: LinearModel) -> NDArray[np.float64]:
    """Directions in the space of unknowns that no observation sees, shape (p, k); k = 0 is good.

    Columns of A are scaled to unit length first, so that units do not decide the rank; the
    directions are orthonormal in the scaled space and given in the scale of the unknowns.
    """
    design = model.design.toarray()
    lengths = np.linalg.norm(design, axis=0)
    scale = np.where(lengths > 0.0, lengths, 1.0)
    directions = linalg.null_space(design / scale, rcond=_RANK_TOLERANCE)
    return np.asarray(directions / scale[:, None])


def solve(model: LinearModel) -> Solution:
    """Estimate all unknowns of `model`.

    Returns
    -------
    Solution
        Best linear unbiased estimates; for singular V in the sense of Rao.

    Raises
    ------
    DataError
        If an unknown is not determined by the observations, or observations that must be equal
        (because they share all their noise and effects) are not.
    """
    blind = null_space(model)
    if blind.shape[1]:
        seen = np.flatnonzero(np.any(np.abs(blind) > 1e-6 * np.abs(blind).max(), axis=1))
        names = ", ".join(str(model.unknowns[i]) for i in seen)
        raise DataError(
            "the observations do not determine all unknowns",
            value=names,
            advice="Add a session that connects them, or state a prior value",
        )
    design, covariance = model.design.toarray(), model.covariance()
    added = float(np.trace(covariance) / max(np.trace(design @ design.T), 1e-300)) or 1.0
    # Rao's T: its range holds both the noise and the design, so its inverse on that range exists.
    inverse, rank = _inverse_on_range(covariance + added * design @ design.T)
    normal = design.T @ inverse @ design
    normal_inverse = linalg.inv(normal)
    gain = normal_inverse @ design.T @ inverse
    estimate = gain @ model.values
    residuals = model.values - design @ estimate
    _refuse_contradiction(model, residuals, inverse)
    # G V Gᵀ rather than N⁻¹ - U: no cancellation, and never below zero.
    spread = gain @ covariance @ gain.T
    chi_squared = float(residuals @ inverse @ residuals)
    freedom = rank - design.shape[1]
    p_value = float(stats.chi2.sf(chi_squared, freedom)) if freedom > 0 else None
    return Solution(
        model=model,
        estimate=estimate,
        covariance=(spread + spread.T) / 2.0,
        gain=gain,
        residuals=residuals,
        fit=Fit(chi_squared if freedom > 0 else 0.0, freedom, p_value),
    )


def _inverse_on_range(matrix: NDArray[np.float64]) -> tuple[NDArray[np.float64], int]:
    """Pseudo-inverse of a positive semidefinite matrix, scaled to unit diagonal first; and rank."""
    root = np.sqrt(np.diag(matrix))
    root = np.where(root > 0.0, root, 1.0)
    values, vectors = linalg.eigh(matrix / np.outer(root, root))
    kept = values > _RANK_TOLERANCE * values[-1]
    scaled = vectors[:, kept] / root[:, None]
    return np.asarray((scaled / values[kept]) @ scaled.T), int(np.count_nonzero(kept))


def _refuse_contradiction(
    model: LinearModel, residuals: NDArray[np.float64], inverse: NDArray[np.float64]
) -> None:
    """Residuals must lie in the range of T; what lies outside could not happen by chance."""
    spread = model.covariance() + np.outer(model.values, model.values) * 1e-24
    # A known number without u must not turn rounding into a contradiction.
    root = np.maximum(np.sqrt(np.diag(spread)), _ROUNDING)
    explained = np.linalg.pinv(inverse, hermitian=True, rcond=1e-15) @ (inverse @ residuals)
    outside = np.abs(residuals - explained) / root
    if outside.size and outside.max() > 1e-3:
        worst = int(np.argmax(outside))
        raise DataError(
            "observations that share all their noise contradict each other",
            value=f"misfit {residuals[worst]:.4g} m2 s-2",
            where=f"observation {model.rows[worst]}",
            advice="Give each its own noise, or leave one out",
        )
