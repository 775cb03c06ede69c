"""Which directions in the space of unknowns no observation sees, for nets of any size.

Almost every row of a height network is a difference of two unknowns or names one. Such rows are
used up first: x_i = x_j joins two unknowns into one, x_i = 0 takes one out, and an unknown that
only one row names is settled by that row. What remains (datum tilts, mostly) is small and dense.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, sparse
from scipy.sparse import csgraph

__all__ = ["NullSpace", "null_space_of"]

_TOLERANCE = 1e-9
"""Singular values of unit columns below this count as zero."""
_PART = 8192


@dataclass(frozen=True, eq=False)
class NullSpace:
    """A readable basis of {x : A x = 0}.

    Attributes
    ----------
    directions : sparse array, shape (p, k)
        Basis vectors; each is 1 at its own pivot and 0 at the others'.
    pivots : int array, shape (k,)
        Unknowns; holding them makes all others determined.
    """

    directions: sparse.csc_array
    pivots: NDArray[np.int64]

    @property
    def dimension(self) -> int:
        """Number k of directions."""
        return int(self.pivots.size)

    @property
    def undetermined(self) -> NDArray[np.bool_]:
        """Which unknowns take part in some direction, shape (p,)."""
        seen = np.zeros(self.directions.shape[0], dtype=bool)
        seen[self.directions.indices] = True
        return seen


def null_space_of(design: sparse.csr_array) -> NullSpace:
    """Find the null space of a design matrix.

    Parameters
    ----------
    design : sparse array, shape (n, p)

    Returns
    -------
    NullSpace

    Notes
    -----
    Columns are scaled to unit length before the rank is decided, so that units do not decide it.
    A direction that is all but unseen (relative 1e-9) counts as unseen.
    """
    lengths = np.sqrt(np.asarray(design.multiply(design).sum(axis=0)).ravel())
    design = sparse.csr_array(design)
    joined = _join(design)
    rows = _collapsed(design, joined)
    rows, settled = _settle(rows)
    basis = _dense_null_space(rows, settled)
    for row, column, coefficient in reversed(settled):
        rest = row @ basis
        basis[column] = -(rest - coefficient * basis[column]) / coefficient
    return _readable(joined, basis, np.where(lengths > 0.0, lengths, 1.0))


def _collapsed(design: sparse.csr_array, joined: sparse.csr_array) -> sparse.csr_array:
    """Rows in terms of groups, without entries that are rounding beside the row they came from."""
    rows = sparse.csr_array(design @ joined)
    if not rows.nnz:
        return rows
    largest = abs(design).max(axis=1).toarray().ravel()
    rows.data[np.abs(rows.data) < 1e-12 * np.repeat(largest, np.diff(rows.indptr))] = 0.0
    rows.eliminate_zeros()
    return rows


def _join(design: sparse.csr_array) -> sparse.csr_array:
    """Map from groups of equal unknowns to the unknowns, shape (p, groups); zero ones left out."""
    count = design.shape[1]
    joined = sparse.csr_array(sparse.eye_array(count))
    while True:
        rows = _collapsed(design, joined)
        number = np.diff(rows.indptr)
        alone = rows.indices[rows.indptr[:-1][number == 1]]
        first = rows.indptr[:-1][number == 2]
        opposite = np.abs(rows.data[first] + rows.data[first + 1]) <= 1e-12 * np.abs(
            rows.data[first]
        )
        ends = rows.indices[first[opposite]], rows.indices[first[opposite] + 1]
        if not alone.size and not ends[0].size:
            return joined
        groups = joined.shape[1]
        links = sparse.coo_array((np.ones(ends[0].size), ends), shape=(groups, groups))
        merged, group = csgraph.connected_components(links, directed=False)
        zero = np.zeros(merged, dtype=bool)
        zero[group[alone]] = True
        place = np.cumsum(~zero) - 1
        kept = np.flatnonzero(~zero[group])
        step = sparse.csr_array(
            (np.ones(kept.size), (kept, place[group[kept]])),
            shape=(groups, int(np.count_nonzero(~zero))),
        )
        joined = sparse.csr_array(joined @ step)


Settled = list[tuple[NDArray[np.float64] | sparse.csr_array, int, float]]


def _settle(rows: sparse.csr_array) -> tuple[sparse.csr_array, Settled]:
    """Use up rows that alone name some unknown; return what is left and what was settled."""
    settled: Settled = []
    while True:
        columns = sparse.csc_array(rows)
        number = np.diff(columns.indptr)
        single = np.flatnonzero(number == 1)
        lines = columns.indices[columns.indptr[:-1][single]]
        lines, chosen = np.unique(lines, return_index=True)
        if not lines.size:
            return rows, settled
        for line, column in zip(lines, single[chosen], strict=True):
            row = sparse.csr_array(rows[[line]])
            settled.append((row, int(column), float(row[0, column])))
        left = np.ones(rows.shape[0], dtype=bool)
        left[lines] = False
        rows = sparse.csr_array(rows[np.flatnonzero(left)])


def _dense_null_space(rows: sparse.csr_array, settled: Settled) -> NDArray[np.float64]:
    """Null space of the remaining rows over all groups; settled groups are 0 for now."""
    groups = rows.shape[1]
    done = {column for _, column, _ in settled}
    open_ones = np.array([g for g in range(groups) if g not in done], dtype=np.int64)
    columns = sparse.csc_array(rows)[:, open_ones]
    touched = np.diff(columns.indptr) > 0
    core, unseen = open_ones[touched], open_ones[~touched]
    matrix = sparse.csr_array(columns[:, np.flatnonzero(touched)])
    lengths = np.sqrt(np.asarray(matrix.multiply(matrix).sum(axis=0)).ravel())
    triangle = np.zeros((0, core.size))
    for start in range(0, matrix.shape[0], _PART):
        part = matrix[start : start + _PART].toarray() / lengths
        triangle = np.asarray(np.linalg.qr(np.vstack([triangle, part]), mode="r"))
    inside = (
        linalg.null_space(triangle, rcond=_TOLERANCE) if triangle.size else np.zeros((core.size, 0))
    )
    basis = np.zeros((groups, unseen.size + inside.shape[1]))
    basis[unseen, np.arange(unseen.size)] = 1.0
    basis[core, unseen.size :] = inside / lengths[:, None] if core.size else 0.0
    return basis


def _readable(
    joined: sparse.csr_array, basis: NDArray[np.float64], lengths: NDArray[np.float64]
) -> NullSpace:
    """Turn any basis over groups into one with a pivot a direction, over unknowns."""
    count = basis.shape[1]
    if count == 0:
        empty = sparse.csc_array((joined.shape[0], 0))
        return NullSpace(empty, np.zeros(0, dtype=np.int64))
    members = sparse.csc_array(joined)
    first = members.indices[members.indptr[:-1]]
    # A group's first unknown stands for it; scaled, so that units do not choose the pivots.
    scaled = basis * lengths[first][:, None]
    scaled /= np.linalg.norm(scaled, axis=0)
    _, _, order = linalg.qr(scaled.T, mode="economic", pivoting=True)
    pivots = np.sort(order[:count])
    plain = scaled @ np.linalg.inv(scaled[pivots])
    plain[np.abs(plain) < 1e-7] = 0.0
    # Unscale by unknown's own length through the group's first member, 1 at the pivot again.
    plain = plain / lengths[first][:, None] * lengths[first][pivots]
    directions = sparse.csc_array(joined @ sparse.csr_array(plain))
    return NullSpace(directions, first[pivots].astype(np.int64))
