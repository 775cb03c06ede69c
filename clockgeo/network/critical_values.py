"""Sizes, powers and critical values of the tests on residuals.

Baarda 1968 (A testing procedure for use in geodetic networks); the B-method ties tests of several
dimensions together by one non-centrality, so that all find the same error with the same power.
"""

from __future__ import annotations

import numpy as np
from scipy import optimize, stats

from clockgeo.errors import DataError

__all__ = [
    "critical_residual",
    "critical_tau",
    "detectable_shift",
    "global_limits",
    "matched_alpha",
]


def _check(**shares: float) -> None:
    for name, share in shares.items():
        if not 0.0 < share < 1.0:
            raise DataError(f"{name} must lie between 0 and 1", value=share)


def _non_centrality(alpha: float, power: float, dimension: int) -> float:
    limit = float(stats.chi2.isf(alpha, dimension))

    def short_of_power(non_centrality: float) -> float:
        return float(stats.ncx2.sf(limit, dimension, non_centrality)) - power

    return float(optimize.brentq(short_of_power, 1e-9, 1e4, xtol=1e-12))


def detectable_shift(*, alpha: float = 0.001, power: float = 0.80) -> float:
    """δ0: shift of a standard normal that a two-sided test of size `alpha` finds with `power`.

    Raises
    ------
    DataError
        If a share does not lie between 0 and 1, or the power is not above alpha.

    Examples
    --------
    >>> round(detectable_shift(), 4)
    4.1321
    """
    _check(alpha=alpha, power=power)
    if power <= alpha:
        raise DataError("the power must be above alpha", value=f"{power} <= {alpha}")
    return float(np.sqrt(_non_centrality(alpha, power, 1)))


def matched_alpha(dimension: int, *, alpha: float = 0.001, power: float = 0.80) -> float:
    """Size of a test of `dimension` that shares δ0² and the power with a single test of `alpha`.

    Examples
    --------
    >>> round(matched_alpha(2), 5)
    0.00284
    """
    if dimension < 1:
        raise DataError("the dimension of a test is at least 1", value=dimension)
    non_centrality = detectable_shift(alpha=alpha, power=power) ** 2
    limit = float(stats.ncx2.isf(power, dimension, non_centrality))
    return float(stats.chi2.sf(limit, dimension))


def critical_residual(alpha: float = 0.001) -> float:
    """Value that |w| exceeds with probability `alpha` (two-sided normal)."""
    _check(alpha=alpha)
    return float(stats.norm.isf(alpha / 2.0))


def critical_tau(degrees_of_freedom: int, *, alpha: float = 0.05) -> float:
    """Value that a residual standardised with the estimated variance factor exceeds (two-sided).

    Parameters
    ----------
    degrees_of_freedom : int
        r >= 2 of the adjustment.
    alpha : float
        Size of the test.

    Notes
    -----
    τ = t √r / √(r - 1 + t²) with t of r - 1 degrees of freedom (Pope 1976, The statistics of
    residuals and the detection of outliers, NOAA NOS 65 NGS 1).
    """
    _check(alpha=alpha)
    if degrees_of_freedom < 2:
        raise DataError(
            "a variance factor and a residual need two degrees of freedom", value=degrees_of_freedom
        )
    t = float(stats.t.isf(alpha / 2.0, degrees_of_freedom - 1))
    return float(t * np.sqrt(degrees_of_freedom / (degrees_of_freedom - 1 + t**2)))


def global_limits(degrees_of_freedom: int, *, alpha: float = 0.05) -> tuple[float, float]:
    """Two-sided limits of the variance factor χ²/r, each end with probability alpha/2."""
    _check(alpha=alpha)
    if degrees_of_freedom < 1:
        raise DataError("the global test needs a degree of freedom", value=degrees_of_freedom)
    low = float(stats.chi2.ppf(alpha / 2.0, degrees_of_freedom))
    high = float(stats.chi2.isf(alpha / 2.0, degrees_of_freedom))
    return low / degrees_of_freedom, high / degrees_of_freedom
