"""Do the stated uncertainties hold, group by group? Variance components by REML.

    V = V_0 + Σ θ_g V_g,     θ_g = 1 where the statement holds

Restricted maximum likelihood (Patterson and Thompson 1971, Biometrika 58:545) by Fisher scoring,
which iterated least-squares estimation equals (Teunissen and Amiri-Simkooei 2008, J. Geod. 82:65):
S_gh = ½ tr(M V_g M V_h), q_g = ½ lᵀM V_g M l, θ = S⁻¹ q, cov(θ) = S⁻¹, with M = V⁻¹ - V⁻¹A Q AᵀV⁻¹.
Components are kept from falling below zero.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, sparse

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.null_space import null_space_of
from clockgeo.network.reliability import reliability_of

__all__ = ["Component", "ComponentEstimate", "scaled_model", "variance_components"]

_DENSE_ROWS = 2500
_ROUNDS = 200
_NOTHING = 1e-9
_AT_REST = 1e-6
"""Relative change below which factors rest; their own u is four orders larger."""


@dataclass(frozen=True, eq=False)
class Component:
    """A group whose variance has a common factor.

    Attributes
    ----------
    name : str
    rows : int array
        Rows whose own noise belongs to it.
    effects : int array
        Effects whose variance belongs to it.
    """

    name: str
    rows: NDArray[np.int64]
    effects: NDArray[np.int64]


@dataclass(frozen=True)
class ComponentEstimate:
    """Factor on a group's variance.

    Attributes
    ----------
    name : str
    factor, u : float
        θ and its standard uncertainty; 1 where the stated uncertainties hold.
    redundancy : float
        Share of the degrees of freedom that speaks for the group.
    at_zero : bool
        Whether the estimate would have fallen below zero.
    """

    name: str
    factor: float
    u: float
    redundancy: float
    at_zero: bool


def variance_components(
    model: LinearModel, components: Sequence[Component]
) -> tuple[ComponentEstimate, ...]:
    """Estimate the variance factors of groups.

    Parameters
    ----------
    model : LinearModel
        Noise and loads as stated; they are the V_g and, outside all groups, V_0.
    components : sequence of Component

    Raises
    ------
    DataError
        If a group is empty or has no redundancy, or the iteration does not come to rest.

    Notes
    -----
    Up to 2500 rows as in the module's head. In larger nets the same fixed point is reached by
    θ_g ← θ_g (vᵀP v)_g / r_g (Förstner 1979), and u is √(2/r_g) θ_g, which leaves out that the
    groups' estimates are correlated.
    """
    for one in components:
        if not one.rows.size and not one.effects.size:
            raise DataError("a group for variance components is empty", value=one.name)
    if len(model.rows) <= _DENSE_ROWS:
        return _reml(model, components)
    return _by_redundancy(model, components)


def scaled_model(
    model: LinearModel, components: Sequence[Component], factors: NDArray[np.float64]
) -> LinearModel:
    """Return the model with the variances of the groups multiplied by their factors."""
    rows, effects = np.ones(len(model.rows)), np.ones(len(model.effects))
    for one, factor in zip(components, factors, strict=True):
        rows[one.rows] = np.sqrt(factor)
        effects[one.effects] = np.sqrt(factor)
    by_row, by_effect = sparse.diags_array(rows), sparse.diags_array(effects)
    return replace(
        model,
        noise=sparse.csr_array(by_row @ model.noise @ by_row),
        loading=sparse.csr_array(model.loading @ by_effect) if effects.size else model.loading,
    )


def _reml(model: LinearModel, components: Sequence[Component]) -> tuple[ComponentEstimate, ...]:
    design = model.design.toarray()
    held = null_space_of(model.design).pivots
    design = np.delete(design, held, axis=1)
    parts = [_part(model, one) for one in components]
    rest = model.covariance() - np.sum([part.toarray() for part in parts], axis=0)
    theta = np.ones(len(parts))
    free = np.ones(len(parts), dtype=bool)
    for _ in range(_ROUNDS):
        covariance = rest.copy()
        for factor, part in zip(theta, parts, strict=True):
            covariance += factor * part.toarray()
        projector = _projector(covariance, design)
        pull = projector @ model.values
        seen = [np.asarray((part @ projector).T) for part in parts]
        information = np.array([[np.sum(a * b.T) for b in seen] for a in seen]) / 2.0
        fixed = projector @ rest
        score = np.array(
            [
                pull @ (part @ pull) - np.sum(fixed * one.T)
                for part, one in zip(parts, seen, strict=True)
            ]
        )
        _require_redundancy(components, information, theta)
        fresh = np.zeros(theta.size)
        fresh[free] = np.linalg.solve(information[np.ix_(free, free)], score[free] / 2.0)
        # A step below zero is shortened; what keeps falling has its best value at zero.
        fresh = np.where(free & (fresh <= 0.0), 0.1 * theta, fresh)
        free &= fresh > _NOTHING
        fresh[~free] = 0.0
        moved = np.max(np.abs(fresh - theta) / np.maximum(np.abs(fresh), 1e-12), initial=0.0)
        theta = fresh
        if moved < _AT_REST:
            break
    else:
        raise _restless()
    spread = np.zeros(theta.size)
    spread[free] = np.diag(np.linalg.inv(information[np.ix_(free, free)]))
    spread[~free] = 1.0 / np.diag(information)[~free]
    redundancy = [t * float(np.trace(one)) for t, one in zip(theta, seen, strict=True)]
    return tuple(
        ComponentEstimate(one.name, float(t), float(np.sqrt(s)), r, not bool(f))
        for one, t, s, r, f in zip(components, theta, spread, redundancy, free, strict=True)
    )


def _part(model: LinearModel, component: Component) -> sparse.csr_array:
    """V_g: the group's noise and effects."""
    inside = np.zeros(len(model.rows))
    inside[component.rows] = 1.0
    chosen = sparse.diags_array(inside)
    loads = model.loading[:, component.effects]
    return sparse.csr_array(chosen @ model.noise @ chosen + loads @ loads.T)


def _projector(covariance: NDArray[np.float64], design: NDArray[np.float64]) -> NDArray[np.float64]:
    """M = V⁻¹ - V⁻¹A (AᵀV⁻¹A)⁻¹ AᵀV⁻¹."""
    try:
        weight = linalg.cho_solve(linalg.cho_factor(covariance), np.eye(covariance.shape[0]))
    except linalg.LinAlgError:
        raise DataError(
            "the covariance of the observations is singular",
            advice="Give every observation noise of its own, or put fewer effects into groups",
        ) from None
    lengths = np.linalg.norm(design, axis=0)
    seen = weight @ (design / np.where(lengths > 0.0, lengths, 1.0))
    scaled = design / np.where(lengths > 0.0, lengths, 1.0)
    return np.asarray(weight - seen @ np.linalg.solve(scaled.T @ seen, seen.T))


def _require_redundancy(
    components: Sequence[Component],
    information: NDArray[np.float64],
    theta: NDArray[np.float64],
) -> None:
    blind = np.diag(information) * theta**2 < 1e-9
    blind &= theta > 1e-3
    if blind.any():
        raise DataError(
            "a group has no redundancy to estimate its variance from",
            value=components[int(np.argmax(blind))].name,
            advice="Join it with another group, or leave it as stated",
        )


def _by_redundancy(
    model: LinearModel, components: Sequence[Component]
) -> tuple[ComponentEstimate, ...]:
    if any(one.effects.size for one in components):
        raise DataError(
            "in a net of this size only the noise of rows can be estimated by group",
            value=f"{len(model.rows)} observations",
            allowed=f"Effects in groups up to {_DENSE_ROWS} observations",
        )
    theta = np.ones(len(components))
    known = None
    for _ in range(_ROUNDS):
        scaled = scaled_model(model, components, theta)
        adjustment = adjust_network(scaled, known=known)
        known = adjustment.identifiability
        reliability = reliability_of(adjustment)
        squares = reliability.pull * adjustment.residuals
        control = reliability.sharpness * scaled.noise.diagonal()
        redundancy = np.array([control[one.rows].sum() for one in components])
        if np.any(redundancy < 1e-6):
            blind = components[int(np.argmin(redundancy))].name
            raise DataError("a group has no redundancy to estimate its variance from", value=blind)
        ratio = np.array([squares[one.rows].sum() for one in components]) / redundancy
        theta = theta * ratio
        if np.max(np.abs(ratio - 1.0)) < 1e-5:
            return tuple(
                ComponentEstimate(one.name, float(t), float(t * np.sqrt(2.0 / r)), float(r), False)
                for one, t, r in zip(components, theta, redundancy, strict=True)
            )
    raise _restless()


def _restless() -> DataError:
    return DataError(
        "the variance components do not come to rest",
        value=f"{_ROUNDS} rounds",
        advice="Join groups, or look for blunders first",
    )
