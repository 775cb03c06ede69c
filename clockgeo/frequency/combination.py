"""One ratio from a whole net of comparators: every path counts, and no datum counts twice.

At each gate the valid comparators form a graph. With x the reduced offset of each oscillator,

    x_B - x_A = (ρ0 ν_A/ν_B - 1) + s_B Δ/ν_B + e,      var(e) = w²,

is an observation of its edge, and x_n - x_0 follows by least squares, with each comparator's own
noise w. Where one path is complete this is the sum along the chain; where several are, they are
weighted, and comparators they share count once. Gates with the same valid comparators share their
weights.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.chain import Chain
from clockgeo.frequency.comparator import Comparator
from clockgeo.frequency.gates import GateLine, gate_line
from clockgeo.frequency.mean import TickSeries
from clockgeo.frequency.record import Record

__all__ = ["Combined", "Loop", "combine", "loops_of"]

_MOST = 62
"""Comparators that a pattern of validity in 64 bits can hold."""
_TABLE_BITS = 16


@dataclass(frozen=True, eq=False)
class Combined:
    """A ratio, and what it was made from.

    Attributes
    ----------
    record : Record
        Fractional deviation from the nominal ratio of the first chain.
    complete : tuple of int
        Gates at which each chain was complete.
    several : int
        Gates at which more than one chain was.
    """

    record: Record
    complete: tuple[int, ...]
    several: int


@dataclass(frozen=True, eq=False)
class Loop:
    """A closed loop of comparators: what must add up to zero, gate by gate.

    Attributes
    ----------
    names : tuple of str
        Comparators in order.
    signs : tuple of int
        +1 where a comparator is run from A to B.
    series : TickSeries
        Sum of the reduced ratios around the loop, fractional.
    interval : float
        Gate time in s.
    """

    names: tuple[str, ...]
    signs: tuple[int, ...]
    series: TickSeries
    interval: float


def combine(
    chains: Sequence[Chain],
    outputs: Mapping[str, Record],
    *,
    name: str,
    noise: Mapping[str, float] | None = None,
) -> Combined:
    """Reduced ratio of two oscillators at every gate at which some chain is complete.

    Parameters
    ----------
    chains : sequence of Chain
        All paths from the one oscillator to the other, the shortest first.
    outputs : mapping of str to Record
        Outputs of the comparators, epochs at the starts of gates.
    name : str
        Of the resulting record.
    noise : mapping of str to float, optional
        Relative standard deviation of a comparator's own noise; 1 where none is given.

    Raises
    ------
    DataError
        If intervals differ, gates do not lie on one grid, or no epoch is common.
    """
    net = _net_of(chains, outputs)
    line = gate_line(net.outputs)
    patterns = _patterns(net, line)
    edges = list(net.comparators)
    bit = {key: 1 << place for place, key in enumerate(edges)}
    needed = [sum(bit[link.comparator.name] for link in chain.links) for chain in chains]
    occurring, number = _numbered(patterns, len(edges))
    weights = np.zeros((occurring.size, len(edges)))
    passable = np.zeros((occurring.size, len(chains)), dtype=bool)
    for row, pattern in enumerate(occurring):
        passable[row] = [not (need & ~int(pattern)) for need in needed]
        if passable[row].any():
            valid = [key for key in edges if int(pattern) & bit[key]]
            found = _weights(net, valid, chains[0], noise or {})
            weights[row, [edges.index(key) for key in valid]] = found
    counts = np.bincount(number, minlength=occurring.size)
    usable = np.asarray(passable.any(axis=1))[number]
    if not usable.any():
        raise DataError(
            "the comparators of the chain have no valid epoch in common",
            value=chains[0].words,
            where=name,
        )
    record = _record(net, line, weights, number, usable, name)
    several = passable.sum(axis=1) > 1
    return Combined(record, tuple((counts @ passable).tolist()), int(counts[several].sum()))


@dataclass(frozen=True, eq=False)
class _Net:
    """Comparators that some chain uses, with exact factors and steps of their reduced ratios."""

    comparators: dict[str, Comparator]
    outputs: dict[str, Record]
    factors: dict[str, Fraction]
    steps: dict[str, Fraction]

    def reduced(self, key: str) -> NDArray[np.float64]:
        """Reduced ratio of a comparator at its usable rows."""
        record = self.outputs[key]
        output = record.y if record.usable.all() else record.y[record.usable]
        step = float(self.steps[key])
        scaled = float(self.factors[key]) * output
        return scaled + step if step else scaled


def _net_of(chains: Sequence[Chain], outputs: Mapping[str, Record]) -> _Net:
    comparators = {link.comparator.name: link.comparator for c in chains for link in c.links}
    if len(comparators) > _MOST:
        raise DataError(
            "too many comparators lie between two oscillators",
            value=len(comparators),
            allowed=f"At most {_MOST}",
            advice="Keep those that are needed in a folder of their own",
        )
    frequency = {chains[0].links[0].start: chains[0].first_frequency}
    for chain in chains:
        here = frequency[chain.links[0].start]
        for link in chain.links:
            ratio = link.comparator.nominal_ratio
            here = here * ratio if link.direction > 0 else here / ratio
            # The first chain that reaches an oscillator gives its nominal frequency.
            here = frequency.setdefault(link.stop, here)
    return _Net(
        comparators,
        {key: outputs[key] for key in comparators},
        {key: one.scale / frequency[one.b] for key, one in comparators.items()},
        {
            key: one.nominal_ratio * frequency[one.a] / frequency[one.b] - 1
            for key, one in comparators.items()
        },
    )


def _patterns(net: _Net, line: GateLine) -> NDArray[np.int64]:
    """Valid comparators of each gate as bits."""
    patterns = np.zeros(line.size, dtype=np.int64)
    for place, key in enumerate(net.comparators):
        patterns[line.places[key]] |= 1 << place
    return patterns


def _numbered(
    patterns: NDArray[np.int64], bits: int
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Patterns that occur, and the number of each gate's among them."""
    if bits > _TABLE_BITS:
        occurring, number = np.unique(patterns, return_inverse=True)
        return occurring, number
    occurring = np.flatnonzero(np.bincount(patterns, minlength=1 << bits))
    table = np.zeros(1 << bits, dtype=np.int64)
    table[occurring] = np.arange(occurring.size)
    return occurring, table[patterns]


def _weights(
    net: _Net, valid: Sequence[str], chain: Chain, noise: Mapping[str, float]
) -> NDArray[np.float64]:
    """Weights of the valid comparators' reduced ratios in x_n - x_0."""
    start, stop = chain.links[0].start, chain.links[-1].stop
    ends = [(net.comparators[key].a, net.comparators[key].b) for key in valid]
    nodes = list(dict.fromkeys(node for pair in ends for node in pair))
    design = np.zeros((len(valid), len(nodes)))
    for row, (a, b) in enumerate(ends):
        design[row, nodes.index(a)], design[row, nodes.index(b)] = -1.0, 1.0
    scaled = design / np.array([[noise.get(key, 1.0)] for key in valid])
    wanted = np.zeros(len(nodes))
    wanted[nodes.index(start)], wanted[nodes.index(stop)] = -1.0, 1.0
    potential = np.linalg.pinv(scaled.T @ scaled, hermitian=True) @ wanted
    found = (scaled @ potential) / np.array([noise.get(key, 1.0) for key in valid])
    return np.where(np.abs(found) < 1e-12, 0.0, found)


def _record(
    net: _Net,
    line: GateLine,
    weights: NDArray[np.float64],
    number: NDArray[np.int64],
    usable: NDArray[np.bool_],
    name: str,
) -> Record:
    total = np.zeros(line.size)
    alone = weights[np.any(weights != 0.0, axis=1)]
    for column, key in enumerate(net.outputs):
        places = line.places[key]
        # One chain has one set of weights; gates where it is not complete are left out anyway.
        here = alone[0, column] if len(alone) == 1 else weights[:, column][number[places]]
        total[places] += here * net.reduced(key)
    places = np.flatnonzero(usable)
    sources = tuple(source for one in net.outputs.values() for source in one.sources)
    notes = tuple(f"{key}: {note}" for key, one in net.outputs.items() for note in one.notes)
    return Record(
        name=name,
        tai_ns=line.starts(places),
        y=total[places],
        usable=np.ones(places.size, dtype=bool),
        interval=line.interval,
        tick=places + line.first,
        sources=sources,
        notes=notes,
        weighting=next(iter(net.outputs.values())).weighting,
    )


def loops_of(chains: Sequence[Chain], outputs: Mapping[str, Record]) -> list[Loop]:
    """Independent loops of the comparators between two oscillators, where each is complete.

    Parameters
    ----------
    chains, outputs
        As in `combine`.

    Returns
    -------
    list of Loop
        One for each comparator beyond those that join all oscillators; those without a common
        valid gate are left out.
    """
    if len(chains) < 2:
        return []
    net = _net_of(chains, outputs)
    line = gate_line(net.outputs)
    found: list[Loop] = []
    tree: dict[str, list[tuple[str, str, int]]] = {}
    for key, one in net.comparators.items():
        way = _way(tree, one.b, one.a)
        if way is None:
            tree.setdefault(one.a, []).append((one.b, key, 1))
            tree.setdefault(one.b, []).append((one.a, key, -1))
            continue
        loop = _loop(net, line, [(key, 1), *way])
        if loop is not None:
            found.append(loop)
    return found


def _way(
    tree: Mapping[str, list[tuple[str, str, int]]], start: str, goal: str
) -> list[tuple[str, int]] | None:
    """Comparators with signs from one oscillator to another in a tree; None if there is no way."""
    queue: deque[tuple[str, list[tuple[str, int]]]] = deque([(start, [])])
    seen = {start}
    while queue:
        here, way = queue.popleft()
        if here == goal:
            return way
        for there, key, sign in tree.get(here, []):
            if there not in seen:
                seen.add(there)
                queue.append((there, [*way, (key, sign)]))
    return None


def _loop(net: _Net, line: GateLine, way: Sequence[tuple[str, int]]) -> Loop | None:
    total, count = np.zeros(line.size), np.zeros(line.size, dtype=np.int64)
    for key, sign in way:
        places = line.places[key]
        total[places] += sign * net.reduced(key)
        count[places] += 1
    places = np.flatnonzero(count == len(way))
    if not places.size:
        return None
    names, signs = zip(*way, strict=True)
    return Loop(names, signs, TickSeries(places + line.first, total[places]), line.interval)
