"""Closed loops of observed differences, and how well they close."""

from __future__ import annotations

from collections import deque
from collections.abc import Collection
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.levelling.linear_model import LinearModel

__all__ = ["Loop", "loop_misclosures"]


@dataclass(frozen=True)
class Loop:
    """A closed loop of differences.

    Attributes
    ----------
    rows : tuple of str
        Observations in the order of the loop.
    signs : tuple of int
        +1 where an observation is run along the loop, -1 where against it.
    misclosure, u : float
        Sum of the signed differences and its standard uncertainty, m² s⁻².
    """

    rows: tuple[str, ...]
    signs: tuple[int, ...]
    misclosure: float
    u: float

    @property
    def standardised(self) -> float:
        """Misclosure over its standard uncertainty."""
        return self.misclosure / self.u if self.u else float("inf") * np.sign(self.misclosure)


def loop_misclosures(
    model: LinearModel, *, kinds: Collection[str] = ("levelled",), at_most: int = 20_000
) -> list[Loop]:
    """Shortest loop through every difference, each once, the worst misclosure first.

    Parameters
    ----------
    model : LinearModel
    kinds : collection of str
        Kinds of rows that count; only rows that are plain differences of two unknowns can.
    at_most : int
        Number of differences for which a loop is looked up; the rest of a larger net is passed by.

    Returns
    -------
    list of Loop
    """
    edges = _edges(model, kinds)
    around: dict[int, list[tuple[int, int]]] = {}
    for row, (start, end) in edges.items():
        around.setdefault(start, []).append((end, row))
        around.setdefault(end, []).append((start, row))
    found: dict[frozenset[int], Loop] = {}
    for row, (start, end) in list(edges.items())[:at_most]:
        path = _shortest_path(around, end, start, avoiding=row)
        if path is None:
            continue
        members = frozenset([row, *path])
        if members not in found:
            found[members] = _closed(model, edges, [row, *path], start)
    return sorted(found.values(), key=lambda loop: -abs(loop.standardised))


def _edges(model: LinearModel, kinds: Collection[str]) -> dict[int, tuple[int, int]]:
    """Row -> (unknown with -1, unknown with +1) of every plain difference."""
    design = model.design
    chosen = np.isin(np.array(model.kinds), list(kinds)) & (np.diff(design.indptr) == 2)
    rows = np.flatnonzero(chosen)
    first = design.indptr[rows]
    low, high = design.data[first], design.data[first + 1]
    plain = (np.abs(low) == 1.0) & (low + high == 0.0)
    ends = np.stack([design.indices[first], design.indices[first + 1]], axis=1)
    ordered = np.where((low < 0.0)[:, None], ends, ends[:, ::-1])
    return {
        int(row): (int(a), int(b))
        for row, (a, b), fits in zip(rows, ordered, plain, strict=True)
        if fits
    }


def _shortest_path(
    around: dict[int, list[tuple[int, int]]], start: int, goal: int, *, avoiding: int
) -> list[int] | None:
    """Rows of a shortest path between two unknowns, without one row."""
    came: dict[int, tuple[int, int] | None] = {start: None}
    queue = deque([start])
    while queue:
        here = queue.popleft()
        if here == goal:
            break
        for there, row in around[here]:
            if row != avoiding and there not in came:
                came[there] = (here, row)
                queue.append(there)
    if goal not in came:
        return None
    path: list[int] = []
    step = came[goal]
    while step is not None:
        path.append(step[1])
        step = came[step[0]]
    return path[::-1]


def _closed(
    model: LinearModel, edges: dict[int, tuple[int, int]], rows: list[int], start: int
) -> Loop:
    signs, here = [], start
    for row in rows:
        first, second = edges[row]
        signs.append(1 if first == here else -1)
        here = second if first == here else first
    weights: NDArray[np.float64] = np.array(signs, dtype=np.float64)
    noise = model.noise[rows][:, rows]
    loads = weights @ model.loading[rows]
    variance = float(weights @ (noise @ weights)) + float(np.sum(loads**2))
    return Loop(
        rows=tuple(model.rows[row] for row in rows),
        signs=tuple(signs),
        misclosure=float(weights @ model.values[rows]),
        u=float(np.sqrt(variance)),
    )
