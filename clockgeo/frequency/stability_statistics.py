"""The statistics of stability: their names, orders and how far they reach."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from clockgeo.errors import DataError

__all__ = ["STATISTICS", "Statistic", "find_statistic"]


@dataclass(frozen=True)
class Statistic:
    """One statistic of stability.

    Attributes
    ----------
    name : str
    order : int
        Differences of phase: 2 of the Allan family, 3 of the Hadamard family.
    kind : {"plain", "overlapping", "modified", "total", "modified-total"}
        How windows are placed and weighted.
    in_time : bool
        Whether the result is a time deviation, τ/√3 times the modified deviation.
    span : int
        Averaging lengths that a single estimate needs.
    """

    name: str
    order: int
    kind: Literal["plain", "overlapping", "modified", "total", "modified-total"]
    span: int
    in_time: bool = False

    @property
    def total(self) -> bool:
        """Whether the record is extended beyond its ends."""
        return self.kind in ("total", "modified-total")


STATISTICS: dict[str, Statistic] = {
    one.name: one
    for one in (
        Statistic("allan", 2, "plain", 2),
        Statistic("overlapping-allan", 2, "overlapping", 2),
        Statistic("modified-allan", 2, "modified", 3),
        Statistic("time", 2, "modified", 3, in_time=True),
        Statistic("hadamard", 3, "plain", 3),
        Statistic("overlapping-hadamard", 3, "overlapping", 3),
        Statistic("total", 2, "total", 1),
        Statistic("modified-total", 2, "modified-total", 3),
        Statistic("time-total", 2, "modified-total", 3, in_time=True),
        Statistic("hadamard-total", 3, "total", 3),
    )
}
"""Name -> statistic; IEEE Std 1139, and NIST SP 1065 (2008) for the total family."""


def find_statistic(name: str) -> Statistic:
    """Return the statistic of that name.

    Raises
    ------
    DataError
        If there is none; names those there are.
    """
    try:
        return STATISTICS[name]
    except KeyError:
        raise DataError(
            "there is no such statistic", value=name, allowed=f"One of {', '.join(STATISTICS)}"
        ) from None
