"""Headers of comparators between two optical clocks and a transfer laser."""

from __future__ import annotations

from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.comparator import comparator_from, refuse_contradictions

__all__ = ["LASER", "SR", "YB", "entry", "printed_chain"]

# Nominal frequencies of an optical clock, a transfer laser and another clock, Hz; outputs scaled by
# the nominal frequency of the compared oscillator. Exact by rational arithmetic.
SR, LASER, YB = "429228004229873.0", "194400121000000.0", "642121496772645.0"


def entry(b, a, *, nu_b, nu_a, scale=None, num=None, den=None):
    return {
        "name": f"{b}-{a}",
        "numrhoBA": num or nu_b,
        "denrhoBA": den or nu_a,
        "sB": scale or nu_b,
        "nu0A": nu_a,
        "nu0B": nu_b,
    }


def printed_chain(entries):
    comparators = [comparator_from(one, where="test") for one in entries]
    refuse_contradictions(comparators)
    return find_chains(
        {one.name: one for one in comparators}, denominator="WEST_SR", numerator="EAST_YB"
    )[0]
