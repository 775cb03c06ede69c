"""Variance components by restricted maximum likelihood, never below zero.

The data are independent pieces z_p ~ (0, Σ θ_l V_lp); each piece is a set of contrasts that see no
mean. Patterson and Thompson 1971, Biometrika 58:545; the covariance of the estimates is the inverse
of Fisher's information, I_kl = ½ Σ_p tr(V⁻¹ V_k V⁻¹ V_l).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import optimize
from scipy.linalg import lapack

__all__ = ["Components", "Piece", "fit_components", "minus_two_log"]

_NOTHING = 1e-9
"""Share of the variance below which a component counts as absent."""
_LOGARITHMS = (-23.0, 7.0)
"""Of shares of the variance: levels of many sizes are sought in their logarithms."""
_RIDGE = 1e-13


@dataclass(frozen=True, eq=False)
class Piece:
    """Contrasts, and their covariance under each component at level one.

    Attributes
    ----------
    values : float array, shape (n,)
    covariances : dict of str to float array, shape (n, n)
    """

    values: NDArray[np.float64]
    covariances: dict[str, NDArray[np.float64]]

    @classmethod
    def of_contrasts(
        cls,
        contrasts: NDArray[np.float64],
        values: NDArray[np.float64],
        covariances: Mapping[str, NDArray[np.float64]],
    ) -> Piece:
        """Contrasts, shape (N, n), of values of known covariances."""
        return cls(
            contrasts.T @ values,
            {law: contrasts.T @ whole @ contrasts for law, whole in covariances.items()},
        )


@dataclass(frozen=True, eq=False)
class Components:
    """Estimated components.

    Attributes
    ----------
    levels : dict of str to float
        θ of each component; absent ones are zero.
    names : tuple of str
        Components above zero, in the order of `covariance`.
    covariance : float array, shape (k, k)
        Of their levels.
    minus_two_log : float
        Of the restricted likelihood, without its constant.
    """

    levels: dict[str, float]
    names: tuple[str, ...]
    covariance: NDArray[np.float64]
    minus_two_log: float

    @property
    def by_doubt(self) -> list[str]:
        """Components above zero, the least certain first."""
        certain = [
            self.levels[name] / max(float(self.covariance[k, k]) ** 0.5, 1e-300)
            for k, name in enumerate(self.names)
        ]
        return [self.names[k] for k in np.argsort(certain)]


def fit_components(
    pieces: Sequence[Piece], names: Sequence[str], *, near: Mapping[str, float] | None = None
) -> Components:
    """Estimate the named components from all pieces together.

    Parameters
    ----------
    pieces : sequence of Piece
    names : sequence of str
        Components that may be present.
    near : mapping of str to float, optional
        Levels to start from, such as those of a fit with more components.
    """
    total = sum(piece.values.size for piece in pieces)
    variance = sum(float(piece.values @ piece.values) for piece in pieces) / total
    # Each component is measured in what would explain all the variance alone.
    unit = {
        name: variance
        * total
        / max(sum(float(np.trace(piece.covariances[name])) for piece in pieces), 1e-300)
        for name in names
    }
    scaled = [
        (
            piece.values / np.sqrt(variance),
            np.array([piece.covariances[name] * unit[name] / variance for name in names]),
        )
        for piece in pieces
    ]

    def loss(log_share: NDArray[np.float64]) -> tuple[float, NDArray[np.float64]]:
        share = np.exp(log_share)
        value, slope = 0.0, np.zeros(share.size)
        for z, parts in scaled:
            inverse, log_determinant = _inverted(np.tensordot(share, parts, axes=1))
            weighted = inverse @ z
            value += log_determinant + float(z @ weighted)
            slope += np.einsum("ij,kij->k", inverse, parts)
            slope -= np.einsum("i,kij,j->k", weighted, parts, weighted)
        return value, slope * share

    start = np.full(len(names), 1.0 / len(names))
    if near is not None:
        start = np.array([near[name] / unit[name] for name in names])
    found = optimize.minimize(
        loss,
        np.clip(np.log(np.maximum(start, _NOTHING)), *_LOGARITHMS),
        jac=True,
        method="L-BFGS-B",
        bounds=[_LOGARITHMS] * len(names),
        options={"maxiter": 200, "ftol": 1e-9, "gtol": 1e-4},
    )
    share = np.where(found.x > np.log(_NOTHING), np.exp(found.x), 0.0)
    present = [int(k) for k in np.flatnonzero(share)]
    information = np.zeros((len(present), len(present)))
    for _, parts in scaled:
        inverse, _ = _inverted(np.tensordot(share, parts, axes=1))
        turned = np.array([inverse @ parts[k] for k in present])
        information += 0.5 * np.einsum("kij,lji->kl", turned, turned)
    size = np.array([unit[names[k]] for k in present])
    return Components(
        levels={name: float(share[k] * unit[name]) for k, name in enumerate(names)},
        names=tuple(names[k] for k in present),
        covariance=np.asarray(np.linalg.pinv(information, hermitian=True) * np.outer(size, size)),
        minus_two_log=float(found.fun) + total * float(np.log(variance)),
    )


def minus_two_log(piece: Piece, levels: Mapping[str, float]) -> float:
    """-2 log of the restricted likelihood of one piece at given levels, without its constant."""
    whole = sum(level * piece.covariances[name] for name, level in levels.items())
    inverse, log_determinant = _inverted(np.asarray(whole))
    return log_determinant + float(piece.values @ inverse @ piece.values)


def _inverted(matrix: NDArray[np.float64]) -> tuple[NDArray[np.float64], float]:
    """Inverse and logarithm of the determinant of a positive matrix; rounding is kept off zero."""
    ridge = _RIDGE * max(float(np.trace(matrix)) / len(matrix), 1e-300)
    factor, failed = lapack.dpotrf(matrix + ridge * np.eye(len(matrix)), lower=1, clean=1)
    half, singular = lapack.dpotri(factor, lower=1)
    if failed or singular:
        raise np.linalg.LinAlgError("a covariance is not positive definite")
    lower = np.tril(half)
    inverse = lower + lower.T
    np.fill_diagonal(inverse, np.diag(half))
    return inverse, 2.0 * float(np.sum(np.log(np.diag(factor))))
