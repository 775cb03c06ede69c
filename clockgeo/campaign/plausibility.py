"""What of measured records contradicts the document: their times, places, and the size of y."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import datetime
from itertools import combinations

import numpy as np

from clockgeo.campaign.measuring import Measured
from clockgeo.times import SECOND_NS, iso_utc, tai_from_iso

__all__ = ["record_problems"]

_SLACK_S = 3600.0
"""How far a record may reach beyond its session's stated times before it is refused."""

_LARGEST_Y = 1e-11
"""Heights on Earth stay below 2e-12, and recommended frequencies are known to 1e-13 or better."""


def record_problems(measured: Sequence[Measured]) -> list[str]:
    """List, as sentences, what of the records contradicts the document or common sense.

    Parameters
    ----------
    measured : sequence of Measured
        Sessions with their records.
    """
    problems: list[str] = []
    for one in measured:
        problems += [*_outside_its_time(one), *_too_far_from_nominal(one)]
    for first, second in combinations(measured, 2):
        problems += _in_two_places(first, second)
    return problems


def _outside_its_time(one: Measured) -> Iterator[str]:
    session = one.session
    for stated, found, sign, word in (
        (session.start, one.record.start, 1, "starts"),
        (session.planned_stop, one.record.stop, -1, "stops"),
    ):
        if stated is None:
            continue
        early = sign * (_tai(stated) - found) / SECOND_NS
        if early > _SLACK_S:
            yield (
                f"[[session]] {session.id!r}: its record {word} at {iso_utc(found, digits=0)}, "
                f"outside the stated {stated:%Y-%m-%dT%H:%MZ}; correct the times or the file"
            )
            return


def _tai(instant: datetime) -> int:
    return tai_from_iso(instant.isoformat())


def _too_far_from_nominal(one: Measured) -> Iterator[str]:
    typical = float(np.median(one.series.y))
    if abs(typical) > _LARGEST_Y:
        yield (
            f"[[session]] {one.session.id!r}: y is typically {typical:.3g}, which no height "
            f"difference on Earth explains (largest accepted: {_LARGEST_Y:g}); check the "
            "transitions or nominal frequencies of both clocks, and the value's kind"
        )


def _in_two_places(first: Measured, second: Measured) -> Iterator[str]:
    """A clock cannot be at two sites while two records run."""
    if first.record.start >= second.record.stop or second.record.start >= first.record.stop:
        return
    for here in first.session.places:
        for there in second.session.places:
            if here.clock == there.clock and here.site != there.site:
                yield (
                    f"[[session]] {second.session.id!r}: clock {here.clock!r} is at "
                    f"{there.site!r} while the record of {first.session.id!r} has it at "
                    f"{here.site!r}"
                )
