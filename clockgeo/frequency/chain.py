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

from clockgeo.errors import DataError
from clockgeo.frequency.comparator import Comparator

__all__ = ["Chain", "Link", "find_chains", "reduced_ratio"]


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
