"""Steps of the level across gaps, where a clock did not come back to where it had been."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

__all__ = ["Step", "steps_across_gaps"]

_FEWEST_ROWS = 20
_FEWEST_DIFFERENCES = 8
_FALSE_ALARM = 0.01
"""Chance that a record without steps has any reported."""


@dataclass(frozen=True)
class Step:
    """A change of level across a gap.

    Attributes
    ----------
    row : int
        First row after the gap.
    size : float
        Level after minus level before, in the unit of the values.
    u : float
        Standard uncertainty of the size.
    """

    row: int
    size: float
    u: float

    @property
    def significance(self) -> float:
        """Size over its u."""
        return abs(self.size) / self.u


def steps_across_gaps(
    tick: NDArray[np.int64], y: NDArray[np.float64], *, gap: int, width: int, scatter: float
) -> list[Step]:
    """Find changes of level across long gaps that chance does not explain.

    Parameters
    ----------
    tick : int64 array, shape (N,)
        Time line, strictly increasing.
    y : float64 array, shape (N,)
        Finite values.
    gap : int
        Missing ticks that make a gap.
    width : int
        Most rows averaged on either side; never across another gap.
    scatter : float
        Standard deviation of a row that s/√N needs to be the true u of a mean: that of the rows
        times the factor by which their correlation makes the naive u too small.

    Returns
    -------
    list of Step
        In time order. Means on both sides are compared with the scatter that means of as many
        rows have without a gap between them, or that follows from the correlated rows, whichever
        is larger; the threshold holds for all gaps of the record together (1 %).
    """
    firsts = np.flatnonzero(np.diff(tick) > gap) + 1
    edges = np.concatenate([[0], firsts, [tick.size]])
    lengths = np.diff(edges)
    rows = np.minimum(lengths, width)
    judged = (rows[:-1] >= _FEWEST_ROWS) & (rows[1:] >= _FEWEST_ROWS)
    count = int(np.count_nonzero(judged))
    if not count:
        return []
    sums = np.append(0.0, np.cumsum(y - y[0]))
    before = (sums[firsts] - sums[firsts - rows[:-1]]) / rows[:-1]
    after = (sums[firsts + rows[1:]] - sums[firsts]) / rows[1:]
    per_row = max(width * _variance_of_means(sums, edges, width), scatter**2)
    u = np.sqrt(per_row / rows[:-1] + per_row / rows[1:])
    size = after - before
    threshold = -float(ndtri(0.5 * _FALSE_ALARM / count))
    found = np.flatnonzero(judged & (np.abs(size) > threshold * u))
    return [Step(int(firsts[at]), float(size[at]), float(u[at])) for at in found]


def _variance_of_means(sums: NDArray[np.float64], edges: NDArray[np.int64], width: int) -> float:
    """Variance of means of `width` rows from differences of neighbours; 0 where there are few."""
    differences = [
        np.diff(np.diff(sums[start : stop + 1 : width]) / width)
        for start, stop in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True)
        if stop - start >= 2 * width
    ]
    together = np.concatenate(differences) if differences else np.empty(0)
    if together.size < _FEWEST_DIFFERENCES:
        return 0.0
    return float((1.4826 * np.median(np.abs(together))) ** 2 / 2.0)
