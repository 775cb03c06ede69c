"""Interpolation in a regular lattice: bilinear, biquadratic and bicubic, one routine for all.

Every method is a weighted sum over a square of nodes; the methods differ only in the weights along
one axis. Nodes without data matter only where their weight is not zero.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import ConventionError

__all__ = ["HALO", "METHODS", "Interpolation", "checked_interpolation", "interpolate"]

Interpolation = Literal["bilinear", "biquadratic", "bicubic"]
Floats = NDArray[np.float64]

HALO = 2
"""Nodes that a lattice is padded with on every side, enough for the widest method."""

_ON_NODE = 1e-9  # of a cell: a node with less weight than this does not count


class _Nodes(NamedTuple):
    """Nodes along one axis: offset of the first from the cell's lower node, and their weights."""

    first: int | NDArray[np.intp]
    weights: tuple[Floats, ...]


def _linear(t: Floats) -> _Nodes:
    return _Nodes(0, (1.0 - t, t))


def _quadratic(t: Floats) -> _Nodes:
    """Parabola through the nearest node and its two neighbours."""
    upper = (t >= 0.5).astype(np.intp)
    s = t - upper
    return _Nodes(upper - 1, (0.5 * s * (s - 1.0), 1.0 - s * s, 0.5 * s * (s + 1.0)))


def _cubic(t: Floats) -> _Nodes:
    """Cubic with central-difference slopes at the nodes (Keys 1981, a = -1/2)."""
    t2 = t * t
    t3 = t2 * t
    weights = (
        0.5 * (-t3 + 2.0 * t2 - t),
        0.5 * (3.0 * t3 - 5.0 * t2 + 2.0),
        0.5 * (-3.0 * t3 + 4.0 * t2 + t),
        0.5 * (t3 - t2),
    )
    return _Nodes(-1, weights)


METHODS: dict[Interpolation, Callable[[Floats], _Nodes]] = {
    "bilinear": _linear,
    "biquadratic": _quadratic,
    "bicubic": _cubic,
}
"""Method -> nodes and weights along one axis as a function of the fraction of a cell."""


def checked_interpolation(stated: str) -> Interpolation:
    """Return the method, or refuse an unknown one.

    Raises
    ------
    ConventionError
        If the method is none of `METHODS`.
    """
    for method in METHODS:
        if stated == method:
            return method
    raise ConventionError(
        "unknown interpolation", value=repr(stated), allowed=f"One of {', '.join(METHODS)}"
    )


def interpolate(
    padded: NDArray[np.floating],
    row: NDArray[np.intp],
    column: NDArray[np.intp],
    row_fraction: Floats,
    column_fraction: Floats,
    *,
    method: Interpolation = "bilinear",
) -> Floats:
    """Interpolate between the nodes of a padded lattice.

    Parameters
    ----------
    padded : array, shape (rows + 2 HALO, columns + 2 HALO), C order
        Values at the nodes, NaN where there is none.
    row, column : int array, shape (N,)
        Lower node of each point's cell, counted without the padding.
    row_fraction, column_fraction : float array, shape (N,)
        Place within the cell, 0 to 1.
    method : {"bilinear", "biquadratic", "bicubic"}

    Returns
    -------
    float array, shape (N,)
        NaN where a node that counts has no value.

    Notes
    -----
    v = Σ_i Σ_j w_i w_j v_ij. Bilinear: the four nodes of the cell. Biquadratic: parabolas through
    the 3 x 3 nodes about the nearest one. Bicubic: 4 x 4 nodes, cubic convolution with a = -1/2
    (Keys 1981, IEEE Trans. Acoust. Speech Signal Process. 29:1153). All reproduce linear fields
    exactly, the latter two quadratic ones.
    """
    weights = METHODS[method]
    rows, columns = weights(row_fraction), weights(column_fraction)
    stride = padded.shape[1]
    first = (row + (HALO + rows.first)) * stride + (column + (HALO + columns.first))
    flat = padded.reshape(-1)
    result = _weighted(flat, first, stride, rows.weights, columns.weights)
    gaps = np.flatnonzero(np.isnan(result))
    if gaps.size:
        result[gaps] = _without_idle_nodes(
            flat,
            first[gaps],
            stride,
            tuple(weight[gaps] for weight in rows.weights),
            tuple(weight[gaps] for weight in columns.weights),
        )
    return result


def _weighted(
    flat: NDArray[np.floating],
    first: NDArray[np.intp],
    stride: int,
    rows: tuple[Floats, ...],
    columns: tuple[Floats, ...],
) -> Floats:
    total = np.zeros(first.shape)
    for i, row_weight in enumerate(rows):
        node = first + i * stride
        line = columns[0] * flat.take(node)
        for column_weight in columns[1:]:
            node += 1
            line += column_weight * flat.take(node)
        line *= row_weight
        total += line
    return total


def _without_idle_nodes(
    flat: NDArray[np.floating],
    first: NDArray[np.intp],
    stride: int,
    rows: tuple[Floats, ...],
    columns: tuple[Floats, ...],
) -> Floats:
    """Sum again without the nodes of zero weight, so that a point on a node needs no neighbour."""
    total = np.zeros(first.shape)
    for i, row_weight in enumerate(rows):
        for j, column_weight in enumerate(columns):
            weight = row_weight * column_weight
            value = flat.take(first + (i * stride + j))
            total += np.where(np.abs(weight) < _ON_NODE, 0.0, weight * value)
    return total
