"""Interpolation in a regular grid: bilinear, biquadratic and bicubic, one stencil routine for all.

Every method is a weighted sum over a square stencil; the methods differ only in the weights along
one axis. Nodes without data matter only where their weight is not zero.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = ["METHODS", "Interpolation", "interpolate"]

Interpolation = Literal["bilinear", "biquadratic", "bicubic"]
Weights = list[NDArray[np.float64]]


def _linear(place: NDArray[np.float64], count: int) -> tuple[NDArray[np.int64], Weights]:
    first = np.clip(np.floor(place).astype(np.int64), 0, count - 2)
    t = place - first
    return first, [1.0 - t, t]


def _quadratic(place: NDArray[np.float64], count: int) -> tuple[NDArray[np.int64], Weights]:
    """Lagrange through the three nearest nodes."""
    first = np.clip(np.rint(place).astype(np.int64) - 1, 0, count - 3)
    t = place - first - 1.0
    return first, [t * (t - 1.0) / 2.0, 1.0 - t**2, t * (t + 1.0) / 2.0]


def _cubic(place: NDArray[np.float64], count: int) -> tuple[NDArray[np.int64], Weights]:
    """Cubic convolution with a = -1/2 (Keys 1981, IEEE Trans. ASSP 29:1153, eq. 15).

    In the outermost cells the missing node is extrapolated, f(-1) = 3 f(0) - 3 f(1) + f(2) (Keys
    1981, eq. 19), which moves its weight onto the three nodes that exist.
    """
    cell = np.clip(np.floor(place).astype(np.int64), 0, count - 2)
    t = place - cell
    w = [
        ((-0.5 * t + 1.0) * t - 0.5) * t,
        (1.5 * t - 2.5) * t**2 + 1.0,
        ((-1.5 * t + 2.0) * t + 0.5) * t,
        (0.5 * t - 0.5) * t**2,
    ]
    low, high = cell == 0, cell == count - 2
    first = np.clip(cell - 1, 0, count - 4)
    from_low = [w[1] + 3 * w[0], w[2] - 3 * w[0], w[3] + w[0], np.zeros_like(t)]
    from_high = [np.zeros_like(t), w[0] + w[3], w[1] - 3 * w[3], w[2] + 3 * w[3]]
    weights = [
        np.where(low, a, np.where(high, b, c))
        for a, b, c in zip(from_low, from_high, w, strict=True)
    ]
    return first, weights


METHODS: dict[str, Callable[[NDArray[np.float64], int], tuple[NDArray[np.int64], Weights]]] = {
    "bilinear": _linear,
    "biquadratic": _quadratic,
    "bicubic": _cubic,
}
_SIZES = {"bilinear": 2, "biquadratic": 3, "bicubic": 4}


def interpolate(
    values: NDArray[np.floating],
    row: NDArray[np.float64],
    column: NDArray[np.float64],
    method: Interpolation = "bilinear",
) -> NDArray[np.float64]:
    """Interpolate a grid at fractional row and column numbers.

    Parameters
    ----------
    values : float array, shape (R, C)
        Node values; NaN for no data. R and C must be at least 2, 3 or 4 for the three methods.
    row, column : float arrays, shape (N,)
        Places within 0..R-1 and 0..C-1.
    method : "bilinear", "biquadratic" or "bicubic"

    Returns
    -------
    float array, shape (N,)
        NaN where a node with weight has no data. Linear fields are reproduced exactly by all
        methods, quadratic ones by the last two.
    """
    rows, columns = values.shape
    first_row, row_weights = METHODS[method](row, rows)
    first_column, column_weights = METHODS[method](column, columns)
    flat = np.ascontiguousarray(values).ravel()
    start = first_row * columns + first_column
    total = np.zeros(row.shape)
    for i, wi in enumerate(row_weights):
        line = np.zeros(row.shape)
        for j, wj in enumerate(column_weights):
            line += _weighted(flat[start + (i * columns + j)], wj)
        total += _weighted(line, wi)
    return total


def _weighted(value: NDArray[np.floating], weight: NDArray[np.float64]) -> NDArray[np.float64]:
    product = value * weight
    missing = np.isnan(product)
    if missing.any():
        product[missing & (weight == 0.0)] = 0.0
    return np.asarray(product)


def smallest_side(method: Interpolation) -> int:
    """Fewest nodes along an axis that the method needs."""
    return _SIZES[method]
