"""Closed loops of observed differences, and how well they close."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np
from scipy import sparse

from clockgeo.levelling.linear_model import LinearModel

__all__ = ["Loop", "loop_misclosures"]

_Steps = dict[int, tuple[int, int] | None]
"""Unknown -> the unknown before it and the row between; None where a search began."""
_Paths = list[list[int]]


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
    found: dict[frozenset[int], list[int]] = {}
    for row, (start, end) in list(edges.items())[:at_most]:
        path = _shortest_path(around, end, start, avoiding=row)
        if path is not None:
            found.setdefault(frozenset([row, *path]), [row, *path])
    loops = _closed(model, edges, list(found.values())) if found else []
    return sorted(loops, key=lambda loop: -abs(loop.standardised))


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
    """Rows of a shortest path between two unknowns, without one row.

    It is searched from both ends, so that a row that nothing closes costs its smaller side only.
    """
    came: tuple[_Steps, _Steps] = ({start: None}, {goal: None})
    fronts = [[start], [goal]]
    side = 0
    while fronts[0] and fronts[1]:
        front: list[int] = []
        for here in fronts[side]:
            for there, row in around[here]:
                if row == avoiding or there in came[side]:
                    continue
                came[side][there] = (here, row)
                if there in came[1 - side]:
                    return _way(came[0], there)[::-1] + _way(came[1], there)
                front.append(there)
        fronts[side] = front
        side = 1 - side
    return None


def _way(came: _Steps, here: int) -> list[int]:
    """Rows from an unknown back to where a search began."""
    rows: list[int] = []
    step = came[here]
    while step is not None:
        rows.append(step[1])
        step = came[step[0]]
    return rows


def _signs(edges: dict[int, tuple[int, int]], rows: list[int]) -> list[int]:
    """+1 for rows that are run from their start to their end, the first of them so, else -1."""
    signs, here = [], edges[rows[0]][0]
    for row in rows:
        first, second = edges[row]
        signs.append(1 if first == here else -1)
        here = second if first == here else first
    return signs


def _closed(model: LinearModel, edges: dict[int, tuple[int, int]], paths: _Paths) -> list[Loop]:
    signs = [_signs(edges, rows) for rows in paths]
    lengths = [len(rows) for rows in paths]
    weights = sparse.csr_array(
        (
            np.array([sign for one in signs for sign in one], dtype=np.float64),
            np.array([row for rows in paths for row in rows], dtype=np.int64),
            np.concatenate([[0], np.cumsum(lengths, dtype=np.int64)]),
        ),
        shape=(len(paths), len(model.rows)),
    )
    loads = sparse.csr_array(weights @ model.loading)
    variance = (weights @ model.noise).multiply(weights).sum(axis=1) + loads.multiply(loads).sum(
        axis=1
    )
    spread = np.sqrt(np.asarray(variance, dtype=np.float64).ravel())
    return [
        Loop(tuple(model.rows[row] for row in rows), tuple(sign), float(misclosure), float(u))
        for rows, sign, misclosure, u in zip(
            paths, signs, weights @ model.values, spread, strict=True
        )
    ]
