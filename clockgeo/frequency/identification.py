"""Which power law rules at an averaging time: lag-1 autocorrelation, and R(n) for phase noise."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError

__all__ = ["dominant_exponent", "lag_one_exponent"]

_FEWEST = 30


def lag_one_exponent(averages: ArrayLike, *, highest_order: int = 2) -> float:
    """Exponent α of S_y = h f^α from the lag-1 autocorrelation of frequency averages.

    Parameters
    ----------
    averages : array, shape (N,)
        Frequency averages over the averaging time; NaN where there is none. At least 30 must be
        there.
    highest_order : int
        Most differences that are taken: 2 reaches α = -4.

    Raises
    ------
    DataError
        If there are fewer than 30 averages or they do not vary.

    Notes
    -----
    r1 is the lag-1 autocorrelation, δ = r1/(1 + r1); the series is differenced d times until
    δ < 0.25, and α = -2 (δ + d). Riley and Greenhall 2004, 18th EFTF (from memory). With gaps only
    neighbours count, and their sum is scaled to the number of pairs there would be.
    """
    series = np.asarray(averages, dtype=np.float64)
    count = int(np.count_nonzero(~np.isnan(series)))
    if count < _FEWEST:
        raise DataError(
            "too few averages to identify the noise",
            value=count,
            allowed=f"At least {_FEWEST}",
        )
    for order in range(highest_order + 1):
        delta = _delta(series)
        if delta < 0.25 or order == highest_order:
            return -2.0 * (delta + order)
        series = np.diff(series)
    raise AssertionError  # the loop returns at its last order


def _delta(series: NDArray[np.float64]) -> float:
    valid = ~np.isnan(series)
    count = int(np.count_nonzero(valid))
    pairs = int(np.count_nonzero(valid[1:] & valid[:-1]))
    if not pairs:
        raise DataError("no averages are neighbours", value=f"{count} averages")
    centred = np.where(valid, series - np.mean(series[valid]), 0.0)
    squares = float(centred @ centred)
    if squares == 0.0:
        raise DataError("constant data show no noise", value=float(series[valid][0]))
    r1 = float(centred[1:] @ centred[:-1]) / squares * (count - 1) / pairs
    # With few pairs the scaled sum can leave -1 to 1; -2/3 is the least of any power law.
    return r1 / (1.0 + max(r1, -0.75))


def dominant_exponent(averages: ArrayLike, ratio: float | None, m: int) -> int:
    """Nearest integer exponent, white and flicker phase noise told apart by R(n).

    Parameters
    ----------
    averages : array, shape (N,)
        As in `lag_one_exponent`.
    ratio : float or None
        R(n): modified over plain Allan variance at the same averaging time; None if not known.
    m : int
        Averaging factor n of R(n).

    Notes
    -----
    For averaged data both phase noises look alike to the autocorrelation; R(n) is 1/n for white PM
    and falls only with the logarithm for flicker PM, so their geometric mean is the limit.
    """
    exponent = int(np.clip(np.rint(lag_one_exponent(averages)), -2, 2))
    if exponent < 1 or ratio is None or m < 2:
        return exponent
    flicker = 3.37 / (3.12 + 3.0 * np.log(np.pi * m))
    return 2 if ratio < np.sqrt(flicker / m) else 1
