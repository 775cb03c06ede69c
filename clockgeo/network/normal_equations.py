"""Normal equations N = BᵀB, factorised once: solutions, variances and covariances of unknowns.

Small systems are inverted densely. Large ones are factorised sparsely; columns that touch very many
rows (a datum's offset, an effect common to a whole network) would fill the factor and are set
aside as a border,

    N = [[S, E], [Eᵀ, D]],   N⁻¹ = diag(S⁻¹, 0) + F C⁻¹ Fᵀ,   F = [-S⁻¹E; I],   C = D - EᵀS⁻¹E.
"""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, sparse

from clockgeo.errors import DataError
from clockgeo.network.selected_inverse import SelectedInverse, selected_inverse

__all__ = ["DENSE_LIMIT", "NormalEquations", "normal_equations"]

DENSE_LIMIT = 2500
"""Number of unknowns up to which the inverse is formed whole."""
_CROWDED = 200
"""Rows in one column beyond which it is set aside."""
_LARGEST_BORDER = 2.0e8
"""Numbers that the border's solution may hold (1.6 GB)."""
_PART = 262_144


class NormalEquations(Protocol):
    """A factorised normal matrix of P unknowns."""

    def solve(self, right: NDArray[np.float64]) -> NDArray[np.float64]:
        """N⁻¹ `right`, shape (P,) or (P, m)."""

    def diagonal(self) -> NDArray[np.float64]:
        """Diagonal of N⁻¹: the variance of every unknown."""

    def at(self, first: NDArray[Any], second: NDArray[Any]) -> NDArray[np.float64]:
        """Entries of N⁻¹ at pairs of unknowns."""


def normal_equations(design: sparse.csr_array, *, dense: bool | None = None) -> NormalEquations:
    """Factorise BᵀB.

    Parameters
    ----------
    design : sparse array, shape (R, P)
        B, rows of unit weight, of full column rank.
    dense : bool, optional
        Whether to invert densely; by size if not given.

    Raises
    ------
    DataError
        If the matrix is not positive definite.
    """
    small = design.shape[1] <= DENSE_LIMIT if dense is None else dense
    lengths = np.sqrt(np.asarray(design.multiply(design).sum(axis=0)).ravel())
    if lengths.size and not lengths.min() > 0.0:
        raise _not_definite()
    # Unit diagonal: values of 1e5 m2 s-2 beside slopes of 1e-7 cost no digits then.
    scale = 1.0 / lengths
    scaled = sparse.csr_array(design @ sparse.diags_array(scale)) if scale.size else design
    return _Dense(scaled, scale) if small else _Sparse(scaled, scale)


def _not_definite() -> DataError:
    return DataError(
        "the normal equations are singular",
        advice="Some unknown is not determined by the observations: look at the null space first",
    )


class _Dense:
    def __init__(self, design: sparse.csr_array, scale: NDArray[np.float64]) -> None:
        matrix = (design.T @ design).toarray()
        self._scale = scale
        try:
            self._factor = linalg.cho_factor(matrix, lower=True)
        except linalg.LinAlgError:
            raise _not_definite() from None
        inverse = linalg.cho_solve(self._factor, np.eye(scale.size))
        self._inverse = (inverse + inverse.T) / 2.0 * np.outer(scale, scale)

    def solve(self, right: NDArray[np.float64]) -> NDArray[np.float64]:
        scaled = (right.T * self._scale).T
        return np.asarray((linalg.cho_solve(self._factor, scaled).T * self._scale).T)

    def diagonal(self) -> NDArray[np.float64]:
        return np.diag(self._inverse).copy()

    def at(self, first: NDArray[Any], second: NDArray[Any]) -> NDArray[np.float64]:
        return np.asarray(self._inverse[first, second])


class _Sparse:
    """Sparse factor of S with a dense border; the selected inverse is made when first asked for."""

    def __init__(self, design: sparse.csr_array, scale: NDArray[np.float64]) -> None:
        from scipy.sparse.linalg import splu

        self._scale = scale
        self._matrix = sparse.csc_array(design.T @ design)
        crowd = np.diff(sparse.csc_array(design).indptr)
        border = _border(crowd)
        inner = np.setdiff1d(np.arange(scale.size), border)
        self._inner, self._edge = inner, border
        core = sparse.csc_array(self._matrix[:, inner][inner])
        try:
            self._factor = splu(
                core,
                permc_spec="MMD_AT_PLUS_A",
                diag_pivot_thresh=0.0,
                options={"SymmetricMode": True},
            )
        except RuntimeError:
            raise _not_definite() from None
        self._pivots = self._factor.U.diagonal()
        if not np.all(self._pivots > 0.0) or np.any(self._factor.perm_r != self._factor.perm_c):
            raise _not_definite()
        self._spread = np.zeros((scale.size, border.size))  # F
        self._capacity: Any = None
        if border.size:
            across = self._matrix[:, border][inner].toarray()
            self._spread[inner] = -self._factor.solve(across)
            self._spread[border, np.arange(border.size)] = 1.0
            corner = self._matrix[:, border][border].toarray() + across.T @ self._spread[inner]
            try:
                self._capacity = linalg.cho_factor((corner + corner.T) / 2.0, lower=True)
            except linalg.LinAlgError:
                raise _not_definite() from None
        self._selected: SelectedInverse | None = None

    def solve(self, right: NDArray[np.float64]) -> NDArray[np.float64]:
        scaled = (right.T * self._scale).T
        first = self._once(scaled)
        refined = first + self._once(scaled - self._matrix @ first)
        return np.asarray((refined.T * self._scale).T)

    def _once(self, right: NDArray[np.float64]) -> NDArray[np.float64]:
        found = np.zeros_like(right)
        found[self._inner] = self._factor.solve(np.ascontiguousarray(right[self._inner]))
        if self._edge.size:
            found += self._spread @ linalg.cho_solve(self._capacity, self._spread.T @ right)
        return found

    def diagonal(self) -> NDArray[np.float64]:
        places = np.arange(self._scale.size)
        return self.at(places, places)

    def at(self, first: NDArray[Any], second: NDArray[Any]) -> NDArray[np.float64]:
        first, second = np.asarray(first).ravel(), np.asarray(second).ravel()
        found = np.zeros(first.size)
        for start in range(0, first.size, _PART):
            part = slice(start, start + _PART)
            found[part] = self._part(first[part], second[part])
        return np.asarray(found * self._scale[first] * self._scale[second])

    def _part(self, first: NDArray[Any], second: NDArray[Any]) -> NDArray[np.float64]:
        place = self._order()
        a, b = place[first], place[second]
        inside = (a >= 0) & (b >= 0)
        found = np.zeros(first.size)
        assert self._selected is not None
        found[inside] = self._selected.at(a[inside], b[inside])
        if self._edge.size:
            right = linalg.cho_solve(self._capacity, self._spread[second].T).T
            found += np.einsum("ij,ij->i", self._spread[first], right)
        for missing in np.flatnonzero(np.isnan(found)):
            unit = np.zeros(self._scale.size)
            unit[second[missing]] = 1.0
            found[missing] = self._once(unit)[first[missing]]
        return found

    def _order(self) -> NDArray[np.int64]:
        """Place of every unknown in the factor; -1 for those of the border."""
        if self._selected is None:
            self._selected = selected_inverse(self._factor.L, self._pivots)
            self._place = np.full(self._scale.size, -1, dtype=np.int64)
            self._place[self._inner] = self._factor.perm_c
        return self._place


def _border(crowd: NDArray[np.int32]) -> NDArray[np.int64]:
    """Columns to set aside: the most crowded ones, as many as memory allows."""
    crowded = np.flatnonzero(crowd > _CROWDED)
    most = int(_LARGEST_BORDER // max(crowd.size, 1))
    if crowded.size > most:
        crowded = np.sort(crowded[np.argsort(-crowd[crowded], kind="stable")[:most]])
    return crowded
