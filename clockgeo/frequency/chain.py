"""Chains of comparators: from clock to clock over combs, lasers and fibres.

    ρ_n0 = [Π ρ0_(i,i-1)] (1 + Σ R_i)
    R_i  =  Δ(i-1 → i) s_i/ν_i          for a comparator in the direction of the chain,
    R_i  = -Δ(i → i-1) s_(i-1)/ν_(i-1)  for one against it,

with the exact nominal product and nominal frequencies ν carried along the chain from the first
oscillator. Lodewyck et al. 2020, Phys. Rev. Research 2, 043269. Products of the R_i, 1e-26, are
left out.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.comparator import Comparator
from clockgeo.frequency.record import Record
from clockgeo.times import SECOND_NS

__all__ = ["Chain", "Link", "chain_record", "find_chains", "reduced_ratio"]

_GRID_SLACK = 0.2
"""Largest distance of a gate from the common grid, in gates."""


@dataclass(frozen=True)
class Link:
    """One comparator in a chain, and its direction: +1 along the chain, -1 against it."""

    comparator: Comparator
    direction: int

    @property
    def start(self) -> str:
        """Oscillator it is entered from."""
        return self.comparator.a if self.direction > 0 else self.comparator.b

    @property
    def stop(self) -> str:
        """Oscillator it leads to."""
        return self.comparator.b if self.direction > 0 else self.comparator.a


@dataclass(frozen=True)
class Chain:
    """A path between two oscillators.

    Attributes
    ----------
    links : tuple of Link
        From the denominator's oscillator to the numerator's.
    """

    links: tuple[Link, ...]

    @property
    def nominal_ratio(self) -> Fraction:
        """Exact product of the nominal ratios, last oscillator over first."""
        product = Fraction(1)
        for link in self.links:
            ratio = link.comparator.nominal_ratio
            product *= ratio if link.direction > 0 else 1 / ratio
        return product

    @property
    def first_frequency(self) -> Fraction:
        """Nominal frequency of the first oscillator in Hz.

        Raises
        ------
        DataError
            If no comparator of the chain states a frequency.
        """
        passed = Fraction(1)
        for link in self.links:
            stated = link.comparator.nominal(link.start)
            if stated is not None:
                return stated / passed
            ratio = link.comparator.nominal_ratio
            passed *= ratio if link.direction > 0 else 1 / ratio
        raise DataError(
            "no comparator of the chain states a nominal frequency",
            value=" - ".join(link.comparator.name for link in self.links),
            advice="Give nu0A or nu0B in one of their headers",
        )

    @property
    def coefficients(self) -> tuple[Fraction, ...]:
        """Exact factor of each output in the sum of reduced ratios."""
        frequency, found = self.first_frequency, []
        for link in self.links:
            ratio = link.comparator.nominal_ratio
            after = frequency * (ratio if link.direction > 0 else 1 / ratio)
            # Δ is referred to the compared oscillator: where it leads to, or where it starts.
            at = after if link.direction > 0 else frequency
            found.append(link.direction * link.comparator.scale / at)
            frequency = after
        return tuple(found)

    @property
    def words(self) -> str:
        """The oscillators in order."""
        return " - ".join([self.links[0].start, *(link.stop for link in self.links)])


def reduced_ratio(chain: Chain, outputs: Sequence[Fraction]) -> Fraction:
    """Σ R_i of one set of outputs, exact.

    Examples
    --------
    See the tests: three optical oscillators with printed digits.
    """
    return sum(
        (factor * output for factor, output in zip(chain.coefficients, outputs, strict=True)),
        Fraction(0),
    )


def find_chains(
    comparators: Mapping[str, Comparator], *, denominator: str, numerator: str
) -> list[Chain]:
    """All paths without repeated oscillators between two, the shortest first.

    Raises
    ------
    DataError
        If an oscillator is unknown or no path leads from one to the other.
    """
    around: dict[str, list[Link]] = {}
    for comparator in comparators.values():
        around.setdefault(comparator.a, []).append(Link(comparator, 1))
        around.setdefault(comparator.b, []).append(Link(comparator, -1))
    for oscillator in (denominator, numerator):
        if oscillator not in around:
            raise DataError(
                "no comparator has such an oscillator",
                value=oscillator,
                allowed=f"Oscillators {', '.join(sorted(around))}",
            )
    found: list[Chain] = []
    queue: deque[tuple[tuple[Link, ...], str]] = deque([((), denominator)])
    while queue:
        links, here = queue.popleft()
        if here == numerator:
            found.append(Chain(links))
            continue
        passed = {denominator, *(link.stop for link in links)}
        for link in around[here]:
            if link.stop not in passed:
                queue.append(((*links, link), link.stop))
    if not found:
        raise DataError(
            "no chain of comparators leads from one oscillator to the other",
            value=f"{denominator} to {numerator}",
            allowed=f"Comparators {', '.join(comparators)}",
        )
    return found


def chain_record(
    chains: Sequence[Chain], outputs: Mapping[str, Record], *, name: str
) -> tuple[Record, list[int]]:
    """Reduced ratio of two oscillators at every epoch at which some chain is complete.

    Parameters
    ----------
    chains : sequence of Chain
        In order of preference. Each epoch is taken from the first chain whose comparators are all
        valid then, so that no output counts twice.
    outputs : mapping of str to Record
        Outputs of the comparators, epochs at the starts of gates.
    name : str
        Of the resulting record.

    Returns
    -------
    (Record, list of int)
        Fractional deviation from the nominal ratio of the first chain, and the number of epochs
        taken from each chain.

    Raises
    ------
    DataError
        If intervals differ, gates do not lie on one grid, or no epoch is common.
    """
    used = {link.comparator.name: outputs[link.comparator.name] for c in chains for link in c.links}
    interval = _common_interval(used)
    phase = _phase(next(iter(used.values())), interval)
    ticks = {key: _common_ticks(record, interval, phase) for key, record in used.items()}
    first = min(int(tick[0]) for tick in ticks.values())
    size = max(int(tick[-1]) for tick in ticks.values()) - first + 1
    y, filled = np.full(size, np.nan), np.zeros(size, dtype=bool)
    nominal = chains[0].nominal_ratio
    counts = []
    for chain in chains:
        total, valid = np.zeros(size), np.ones(size, dtype=bool)
        for link, factor in zip(chain.links, chain.coefficients, strict=True):
            record = used[link.comparator.name]
            places = ticks[link.comparator.name][record.usable] - first
            here = np.zeros(size, dtype=bool)
            here[places] = True
            valid &= here
            total[places] += float(factor) * record.y[record.usable]
        fresh = valid & ~filled
        # Another chain may have another nominal ratio; the step between them is exact.
        y[fresh] = total[fresh] + float(chain.nominal_ratio / nominal - 1)
        filled |= fresh
        counts.append(int(np.count_nonzero(fresh)))
    if not filled.any():
        raise DataError(
            "the comparators of the chain have no valid epoch in common",
            value=chains[0].words,
            where=name,
        )
    places = np.flatnonzero(filled)
    step = round(interval * SECOND_NS)
    record = Record(
        name=name,
        tai_ns=(places + first) * step + phase,
        y=y[places],
        usable=np.ones(places.size, dtype=bool),
        interval=interval,
        tick=places + first,
        sources=tuple(source for one in used.values() for source in one.sources),
        notes=tuple(f"{key}: {note}" for key, one in used.items() for note in one.notes),
        weighting=next(iter(used.values())).weighting,
    )
    return record, counts


def _common_interval(records: Mapping[str, Record]) -> float:
    intervals = {key: record.interval for key, record in records.items()}
    smallest, largest = min(intervals.values()), max(intervals.values())
    if largest - smallest > 1e-6 * smallest:
        raise DataError(
            "the comparators of a chain have different gate times",
            value=", ".join(f"{key} {value:g} s" for key, value in intervals.items()),
            advice="Average the faster ones to the slowest gate first",
        )
    return smallest


def _phase(record: Record, interval: float) -> int:
    """Where the gates of a record lie on the line of its interval, ns; rounding averages out."""
    step = round(interval * SECOND_NS)
    angles = 2.0 * np.pi * (record.tai_ns % step) / step
    mean = np.angle(np.mean(np.exp(1j * angles)))
    return round(float(mean) / (2.0 * np.pi) * step)


def _common_ticks(record: Record, interval: float, phase: int) -> NDArray[np.int64]:
    """Gates as places on the common line; each place at most once."""
    step = round(interval * SECOND_NS)
    distance = (record.tai_ns - phase) / step
    tick = np.rint(distance).astype(np.int64)
    off = float(np.max(np.abs(distance - tick)))
    if off > _GRID_SLACK:
        raise DataError(
            "gates do not lie on the grid of the other comparators",
            value=f"off by {off * interval:.3f} s",
            where=record.name,
            allowed=f"At most {_GRID_SLACK * interval:g} s",
            advice="Check lag and interval in the header",
        )
    if np.any(np.diff(tick) <= 0):
        raise DataError("two rows fall on one gate", where=record.name)
    return tick
