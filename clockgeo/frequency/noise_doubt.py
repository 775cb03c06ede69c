"""Doubt about noise: which laws, which ratio of levels, and what that makes of an interval."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import optimize, stats

__all__ = ["reference_prior", "schwarz_penalty", "student_of_mixture"]

_SHARES = (0.683, 0.95)
_FEWEST = 1.0


def schwarz_penalty(parameters: int, freedom: int) -> float:
    """What Schwarz's criterion adds to -2 log L: k ln(n), so that no law is taken up by chance.

    G. Schwarz 1978, Annals of Statistics 6:461. With some hundred contrasts a law too many is
    chosen once in a hundred records, where Akaike's criterion would take one in ten; a random walk
    that is none makes u several times too large.
    """
    return parameters * float(np.log(freedom))


def reference_prior(
    ratios: NDArray[np.float64], seen: NDArray[np.float64], freedom: int
) -> NDArray[np.float64]:
    """Reference prior of the ratio of two variance components, on a grid.

    Parameters
    ----------
    ratios : float array, shape (R,)
        Second over first component, evenly spaced in the logarithm.
    seen : float array, shape (f,)
        Variance of each of f independent contrasts under the second component alone, in units of
        that of the first.
    freedom : int
        f.

    Returns
    -------
    float array, shape (R,)
        Probabilities that add up to one.

    Notes
    -----
    The square root of Fisher's information on the logarithm of the ratio that is left when the
    level is unknown, √(Σ x² - (Σ x)²/f) with x = r λ/(1 + r λ); Berger and Bernardo 1992, Bayesian
    Statistics 4:35, for two ordered groups. Intervals from it hold what they claim to first order.
    """
    x = ratios[:, None] * seen[None, :]
    x /= 1.0 + x
    information = np.sum(x**2, axis=1) - np.sum(x, axis=1) ** 2 / freedom
    density = np.sqrt(np.maximum(information, 0.0))
    return np.asarray(density / density.sum())


def student_of_mixture(
    weight: NDArray[np.float64], scales: NDArray[np.float64], freedom: float
) -> tuple[float, float]:
    """The one Student's t with the same 68.3 % and 95 % intervals as a mixture of many.

    Parameters
    ----------
    weight : float array, shape (M,)
        Probabilities that add up to one.
    scales : float array, shape (M,)
        Scales of the parts, all of mean zero.
    freedom : float
        Degrees of freedom of each part.

    Returns
    -------
    (float, float)
        Its scale and its degrees of freedom, from 1 to `freedom`.
    """
    unit = float(np.sqrt(weight @ scales**2))
    relative = scales / unit

    def half_width(share: float) -> float:
        tail = (1.0 - share) / 2.0

        def excess(x: float) -> float:
            return float(weight @ stats.t.sf(x / relative, freedom)) - tail

        return float(optimize.brentq(excess, 0.0, 100.0 * float(relative.max()), xtol=1e-9))

    inner, outer = (half_width(share) for share in _SHARES)

    def longer_tail(candidate: float) -> float:
        low, high = (float(stats.t.ppf(0.5 + share / 2.0, candidate)) for share in _SHARES)
        return high / low - outer / inner

    if longer_tail(freedom) >= 0.0:
        found = freedom
    elif longer_tail(_FEWEST) <= 0.0:
        found = _FEWEST
    else:
        found = float(optimize.brentq(longer_tail, _FEWEST, freedom))
    return unit * outer / float(stats.t.ppf(0.5 + _SHARES[1] / 2.0, found)), found
