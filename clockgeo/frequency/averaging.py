"""Averaging times: which multiples of the sampling interval a curve is computed at."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from clockgeo.errors import DataError

__all__ = ["averaging_factors"]

_STEPS_PER_DECADE = (1, 2, 4)


def averaging_factors(wanted: str | Sequence[float], *, interval: float, largest: int) -> list[int]:
    """Averaging factors m, so that τ = m times the interval.

    Parameters
    ----------
    wanted : {"octave", "decade", "all"} or sequence of float
        Powers of two; 1, 2, 4 in each decade; every one; or averaging times in s, each of which is
        taken to the nearest multiple of the interval.
    interval : float
        Sampling interval in s.
    largest : int
        Largest factor that the record allows.

    Raises
    ------
    DataError
        If the record allows none, the word is unknown, or a time is not between the interval and
        the longest possible.

    Examples
    --------
    >>> averaging_factors("octave", interval=1.0, largest=20)
    [1, 2, 4, 8, 16]
    """
    if largest < 1:
        raise DataError(
            "the record is too short for a deviation",
            value=f"longest averaging factor {largest}",
            allowed="At least three samples, four for the Hadamard family",
        )
    if isinstance(wanted, str):
        every = {
            "octave": [2**k for k in range(63) if 2**k <= largest],
            "decade": [
                step * 10**k
                for k in range(19)
                for step in _STEPS_PER_DECADE
                if step * 10**k <= largest
            ],
            "all": list(range(1, largest + 1)) if wanted == "all" else [],
        }
        if wanted not in every:
            raise DataError(
                "unknown choice of averaging times",
                value=wanted,
                allowed="octave, decade, all, or times in s",
            )
        return every[wanted]
    factors = []
    for tau in wanted:
        factor = int(np.rint(tau / interval)) if np.isfinite(tau) else 0
        if not 1 <= factor <= largest:
            raise DataError(
                "an averaging time is out of reach of the record",
                value=f"{tau:g} s",
                allowed=f"{interval:g} s to {largest * interval:g} s",
            )
        factors.append(factor)
    return sorted(set(factors))
