"""Running median and running robust spread of a record with gaps, for millions of rows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Running", "running_median_and_spread"]

_MAD_TO_SIGMA = 1.482602218505602
"""Standard deviation of a normal distribution over its median absolute deviation."""
_SPREAD_BLOCKS = 9
"""Neighbouring blocks whose spreads are pooled by their median."""
_ENOUGH_ROWS = 30
"""Rows of a block that make its own spread worth having."""


@dataclass(frozen=True, eq=False)
class Running:
    """Local level and spread at every row.

    Attributes
    ----------
    median : float64 array, shape (N,)
        Median of the surrounding block, interpolated between block centres.
    spread : float64 array, shape (N,)
        Robust standard deviation about it, from the median absolute deviation.
    """

    median: NDArray[np.float64]
    spread: NDArray[np.float64]


def running_median_and_spread(
    tick: NDArray[np.int64], y: NDArray[np.float64], *, width: int
) -> Running:
    """Estimate level and spread in blocks of about `width` rows that cross no gap of that length.

    Parameters
    ----------
    tick : int64 array, shape (N,)
        Time line, strictly increasing.
    y : float64 array, shape (N,)
        Finite values.
    width : int
        Rows of a block, >= 2; also the gap, in ticks, that ends a stretch.

    Returns
    -------
    Running
        Level and spread of every row.

    Notes
    -----
    Each stretch between long gaps is cut into equal blocks of about `width` rows. Medians are
    joined by straight lines between block centres and held at the ends of a stretch. The spread
    is 1.4826 times the median absolute deviation about that line, pooled by the median over nine
    neighbouring blocks, so that it follows slow changes but not a burst, and so that rows
    correlated by a servo still give many independent ones. Blocks with few rows take the pooled
    spread of the record.
    """
    edges, stretch_edges = _blocks(tick, width)
    counts = np.diff(edges)
    medians = _block_medians(y, edges)
    centres = np.asarray(0.5 * (tick[edges[:-1]] + tick[edges[1:] - 1]), dtype=np.float64)
    level = _interpolated(tick, centres, medians, edges, stretch_edges)
    deviations = _block_medians(np.abs(y - level), edges) * _MAD_TO_SIGMA
    return Running(level, np.repeat(_pooled(deviations, counts), counts))


def _blocks(tick: NDArray[np.int64], width: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """First rows of all blocks, and of all stretches, each with the number of rows at the end."""
    starts = np.append(0, np.flatnonzero(np.diff(tick) > width) + 1)
    stretch_edges = np.append(starts, tick.size)
    lengths = np.diff(stretch_edges)
    blocks = np.maximum(1, np.rint(lengths / width).astype(np.int64))
    within = np.arange(blocks.sum()) - np.repeat(np.cumsum(blocks) - blocks, blocks)
    firsts = np.repeat(starts, blocks) + within * np.repeat(lengths, blocks) // np.repeat(
        blocks, blocks
    )
    return np.append(firsts, tick.size), stretch_edges


def _block_medians(values: NDArray[np.float64], edges: NDArray[np.int64]) -> NDArray[np.float64]:
    """Median of every block: blocks of one size are sorted together as rows of a matrix."""
    counts = np.diff(edges)
    medians = np.empty(counts.size)
    for count in np.unique(counts).tolist():
        which = np.flatnonzero(counts == count)
        rows = values[edges[which, None] + np.arange(count)]
        medians[which] = np.median(rows, axis=1)
    return medians


def _interpolated(
    tick: NDArray[np.int64],
    centres: NDArray[np.float64],
    medians: NDArray[np.float64],
    edges: NDArray[np.int64],
    stretch_edges: NDArray[np.int64],
) -> NDArray[np.float64]:
    """Straight lines between block centres, held at the ends of each stretch."""
    first = np.searchsorted(edges, stretch_edges[:-1])
    last = np.append(first[1:], medians.size) - 1
    # The half tick keeps these points apart from the centre of a block of one row.
    nodes = np.concatenate(
        [tick[stretch_edges[:-1]] - 0.25, centres, tick[stretch_edges[1:] - 1] + 0.25]
    )
    levels = np.concatenate([medians[first], medians, medians[last]])
    order = np.argsort(nodes, kind="stable")
    origin = tick[0]
    return np.asarray(np.interp(tick - origin, nodes[order] - origin, levels[order]))


def _pooled(spreads: NDArray[np.float64], counts: NDArray[np.int64]) -> NDArray[np.float64]:
    """Median of neighbouring spreads; that of the record for blocks with few rows."""
    enough = counts >= min(_ENOUGH_ROWS, int(counts.max()))
    record = float(np.median(spreads[enough]))
    own = np.where(enough, spreads, record)
    padded = np.pad(own, _SPREAD_BLOCKS // 2, mode="reflect" if own.size > 4 else "edge")
    return np.asarray(
        np.median(np.lib.stride_tricks.sliding_window_view(padded, _SPREAD_BLOCKS), axis=1)
    )
