"""From a `LinearModel` to rows of unit weight, with the effects as further unknowns.

    W l = W A x + W L z + e,     0 = z + e',     e, e' ~ (0, I),     WᵀW = N⁻¹

This is the same estimation as with V = N + L Lᵀ, but it stays sparse: an effect that acts on many
rows costs one column. An effect that acts on one row only is part of that row's noise. A row
without any uncertainty that names one unknown fixes it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, sparse
from scipy.sparse import csgraph

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel

__all__ = ["WhitenedSystem", "whiten"]

Places = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class WhitenedSystem:
    """Rows of unit weight B s = y with s = (free unknowns, effects).

    Attributes
    ----------
    model : LinearModel
    whitener : sparse array, shape (n, n)
        W; rows of exact observations are empty.
    design : sparse array, shape (n + q', P)
        B; the last q' rows are the priors of the effects.
    values : float array, shape (n + q',)
    free : int array, shape (f,)
        Unknowns that are estimated, as places in `model.unknowns`; the first f columns of B.
    common : int array, shape (q',)
        Effects that act on more than one row, as places in `model.effects`; the last columns.
    known : float array, shape (p,)
        Values of the unknowns that are not estimated; 0 elsewhere.
    exact : int array
        Rows without any uncertainty.
    fixed : dict of int to int
        Exact row -> unknown that it fixes; the first row, where several fix one.
    blocks : tuple of int arrays
        Rows that share their noise, one array a group of two or more.
    """

    model: LinearModel
    whitener: sparse.csr_array
    design: sparse.csr_array
    values: NDArray[np.float64]
    free: Places
    common: Places
    known: NDArray[np.float64]
    exact: Places
    fixed: dict[int, int]
    blocks: tuple[Places, ...]

    @property
    def degrees_of_freedom(self) -> int:
        """Rows less unknowns."""
        return len(self.model.rows) - self.exact.size - self.free.size


def whiten(
    model: LinearModel,
    *,
    held: Places | None = None,
    row_weights: NDArray[np.float64] | None = None,
) -> WhitenedSystem:
    """Give every row unit weight.

    Parameters
    ----------
    model : LinearModel
    held : int array, optional
        Unknowns held at zero, such as one for each direction that the rows do not see.
    row_weights : float array, shape (n,), optional
        Factors of the rows' weights, 0 to leave a row out; P becomes D P D with D² the factors.

    Raises
    ------
    DataError
        If a row has no noise of its own, two rows fix one unknown at different values, or an exact
        row names several unknowns.
    """
    loading = sparse.csc_array(model.loading)
    loading.eliminate_zeros()
    touched = np.diff(loading.indptr)
    common = np.flatnonzero(touched > 1)
    private = sparse.csr_array(loading[:, np.flatnonzero(touched == 1)])
    shared = sparse.csr_array(loading[:, common])
    own = np.asarray(private.multiply(private).sum(axis=1)).ravel()
    noise = sparse.csr_array(model.noise + sparse.diags_array(own)) if own.size else model.noise
    blocks, single = _noise_blocks(noise)
    variance = noise.diagonal()
    silent = single[variance[single] <= 0.0]
    exact = silent[np.diff(shared.indptr)[silent] == 0]
    if silent.size > exact.size:
        raise _without_noise(model, np.setdiff1d(silent, exact)[0])
    known, fixed = _fixed_values(model, exact)
    whitener = _whitener(model, noise, blocks, np.setdiff1d(single, exact), row_weights)
    gone = np.union1d(
        np.array(sorted(fixed.values()), dtype=np.int64),
        np.array([] if held is None else held, dtype=np.int64),
    )
    free = np.setdiff1d(np.arange(len(model.unknowns)), gone)
    columns = sparse.hstack([sparse.csc_array(model.design)[:, free], shared], format="csr")
    prior = sparse.hstack(
        [sparse.csr_array((common.size, free.size)), sparse.eye_array(common.size)], format="csr"
    )
    observed = whitener @ (model.values - model.design @ known)
    return WhitenedSystem(
        model=model,
        whitener=whitener,
        design=sparse.csr_array(sparse.vstack([whitener @ columns, prior], format="csr")),
        values=np.concatenate([observed, np.zeros(common.size)]),
        free=free,
        common=common,
        known=known,
        exact=exact,
        fixed=fixed,
        blocks=blocks,
    )


def _noise_blocks(noise: sparse.csr_array) -> tuple[tuple[Places, ...], Places]:
    """Groups of rows that share noise, and the rows that share none."""
    count, group = csgraph.connected_components(noise, directed=False)
    size = np.bincount(group, minlength=count)
    single = np.flatnonzero(size[group] == 1)
    joint = np.flatnonzero(size[group] > 1)
    order = joint[np.argsort(group[joint], kind="stable")]
    ends = np.flatnonzero(np.diff(group[order])) + 1
    return tuple(np.split(order, ends)) if order.size else (), single


def _whitener(
    model: LinearModel,
    noise: sparse.csr_array,
    blocks: tuple[Places, ...],
    single: Places,
    row_weights: NDArray[np.float64] | None,
) -> sparse.csr_array:
    size = len(model.rows)
    lines, columns = [single], [single]
    entries = [1.0 / np.sqrt(noise.diagonal()[single])]
    for block in blocks:
        try:
            root = linalg.cholesky(noise[block][:, block].toarray(), lower=True)
        except linalg.LinAlgError:
            raise _without_noise(model, block[0]) from None
        inverse = linalg.solve_triangular(root, np.eye(block.size), lower=True)
        row, column = np.tril_indices(block.size)
        lines.append(block[row])
        columns.append(block[column])
        entries.append(inverse[row, column])
    places = (np.concatenate(lines), np.concatenate(columns))
    whitener = sparse.csr_array((np.concatenate(entries), places), shape=(size, size))
    if row_weights is None:
        return whitener
    return sparse.csr_array(whitener @ sparse.diags_array(np.sqrt(row_weights)))


def _fixed_values(model: LinearModel, exact: Places) -> tuple[NDArray[np.float64], dict[int, int]]:
    """Values of the unknowns that exact rows fix, and row -> unknown."""
    known = np.zeros(len(model.unknowns))
    by_unknown: dict[int, int] = {}
    for row in map(int, exact):
        entries = slice(model.design.indptr[row], model.design.indptr[row + 1])
        columns = model.design.indices[entries]
        if columns.size != 1:
            raise DataError(
                "an observation without uncertainty must name one unknown",
                value=f"it names {columns.size}",
                where=f"observation {model.rows[row]}",
                advice="Give it a standard uncertainty",
            )
        column, value = int(columns[0]), model.values[row] / model.design.data[entries][0]
        first = by_unknown.setdefault(column, row)
        if first == row:
            known[column] = value
        elif not np.isclose(known[column], value, rtol=1e-12, atol=0.0):
            raise DataError(
                "two observations fix one unknown at different values",
                value=f"{known[column]} and {value}",
                where=f"observations {model.rows[first]} and {model.rows[row]}",
                advice="Give one of them a standard uncertainty",
            )
    return known, {row: column for column, row in by_unknown.items()}


def _without_noise(model: LinearModel, row: int) -> DataError:
    return DataError(
        "an observation has no noise of its own, only what it shares with others",
        where=f"observation {model.rows[int(row)]}",
        advice="Give it a statistical uncertainty, or leave out what repeats others",
    )
