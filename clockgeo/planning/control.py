"""No uncontrolled tie: every site must hang on the rest by more than one session.

Sites are the nodes of a graph, sessions between two sites its edges. A session is uncontrolled if
it alone joins two parts of the graph: nothing else can show that it is wrong. With a share s, the
others across every cut must last at least s of all the time across it:

    s w_k <= (1 - s) Σ_{j in the cut, j ≠ k} w_j.

There are many cuts, so only those that an allocation breaks are stated, found as minimal cuts.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.csgraph import breadth_first_order, maximum_flow

from clockgeo.planning.design_problem import Array, DesignProblem
from clockgeo.planning.optimum import Optimum, optimise

__all__ = ["Ties", "broken_cuts", "optimise_controlled", "uncontrolled"]

_UNITS = 10**8
"""Whole numbers that stand for the longest time, for flows."""
_ROUNDS = 60
_SLACK = 1e-6


@dataclass(frozen=True, eq=False)
class Ties:
    """The graph of sites and sessions.

    Attributes
    ----------
    ends : int array, shape (n, 2)
        Nodes of every session that may be given time; equal for a session in one place.
    fixed : tuple of (int, int, float)
        Further ties with their time: planned sessions, and infinite for data of other kinds.
    nodes : int
    """

    ends: NDArray[np.int64]
    fixed: tuple[tuple[int, int, float], ...]
    nodes: int


def uncontrolled(ties: Ties, w: Array) -> list[int]:
    """Sessions with time that alone join two parts of the graph."""
    return [
        k
        for k in range(len(w))
        if w[k] > 0.0
        and ties.ends[k, 0] != ties.ends[k, 1]
        and _flow_without(ties, np.where(w > 0.0, 1.0, 0.0), k)[0] == 0.0
    ]


def broken_cuts(ties: Ties, w: Array, share: float) -> Iterator[tuple[int, list[int], float]]:
    """Cuts across which one session has more than its share.

    Yields
    ------
    (int, list of int, float)
        The session, the others across the cut, and the time of fixed ties across it.
    """
    tiny = _SLACK * float(np.max(w, initial=0.0))
    for k in np.argsort(-w, kind="stable").tolist():
        if w[k] <= tiny or ties.ends[k, 0] == ties.ends[k, 1]:
            continue
        flow, near = _flow_without(ties, w, k)
        if share * w[k] > (1.0 - share) * flow + tiny:
            across = [
                j
                for j in range(len(w))
                if j != k and (ties.ends[j, 0] in near) != (ties.ends[j, 1] in near)
            ]
            fixed = sum(time for i, j, time in ties.fixed if (i in near) != (j in near))
            yield k, across, fixed


def _flow_without(ties: Ties, w: Array, k: int) -> tuple[float, set[int]]:
    """Largest flow between the ends of session k without it, and the nodes on its first side."""
    longest = float(np.max(w, initial=0.0)) or 1.0
    others = [j for j in range(len(w)) if j != k and w[j] > 0.0]
    edges = [(int(ties.ends[j, 0]), int(ties.ends[j, 1]), float(w[j])) for j in others]
    edges += [(i, j, min(time, 20.0 * longest)) for i, j, time in ties.fixed]
    capacity = np.zeros((ties.nodes, ties.nodes))
    for i, j, time in edges:
        capacity[i, j] += time
        capacity[j, i] += time
    np.fill_diagonal(capacity, 0.0)
    whole = sparse.csr_array(
        np.rint(np.minimum(capacity / longest, 20.0) * _UNITS).astype(np.int32)
    )
    source, sink = int(ties.ends[k, 0]), int(ties.ends[k, 1])
    found = maximum_flow(whole, source, sink)
    rest = sparse.csr_array(((whole - found.flow).toarray() > 0).astype(np.float64))
    reached = breadth_first_order(rest, source, directed=True, return_predecessors=False)
    return found.flow_value * longest / _UNITS, set(reached.tolist())


def optimise_controlled(
    problem: DesignProblem, ties: Ties, share: float, *, gap: float = 1e-9
) -> Optimum:
    """Minimise the criterion over all allocations in which no session lacks control.

    Parameters
    ----------
    problem : DesignProblem
    ties : Ties
        One edge a row of the problem.
    share : float
        Share of the time across a cut that the others must have, below one half.
    gap : float
        Wanted certificate gap.

    Raises
    ------
    DataError
        If the candidates cannot control each other.

    Notes
    -----
    Each round states the cuts that the optimum so far breaks; its bound holds for the controlled
    problem too, since that has more constraints.
    """
    found = optimise(problem, gap=gap)
    for _ in range(_ROUNDS):
        cuts = list(broken_cuts(ties, found.w, share))
        if not cuts:
            return found
        more = np.zeros((len(cuts), len(found.w)))
        limit = np.zeros(len(cuts))
        for row, (k, across, fixed) in enumerate(cuts):
            more[row, k] = share
            more[row, across] = -(1.0 - share)
            limit[row] = (1.0 - share) * fixed
        problem = problem.constrained(more, limit)
        found = optimise(problem, gap=gap)
    return found
