"""Excess scatter: what sessions differ by beyond their own statistics."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy import linalg, optimize, stats

from clockgeo.errors import DataError

__all__ = ["HIDDEN", "ExcessScatter", "excess_scatter"]

HIDDEN = 3.0
"""Factor on the freedom where no excess is found."""
_BLIND = 1e-9
"""Share of the largest below which a contrast sees nothing of the offsets."""


@dataclass(frozen=True)
class ExcessScatter:
    """Standard deviation of an independent offset of each value, and how well it is known.

    Attributes
    ----------
    standard_deviation : float
        REML estimate, never negative, in the unit of the values.
    lower, upper : float
        Ends of the 95 % profile interval; the lower end may be 0.
    birge_ratio : float or None
        Square root of chi squared over its degrees of freedom, a diagnostic only.
    degrees_of_freedom : int
        Number of values, or groups, minus what the design takes up.
    p_value : float or None
        Probability of a larger chi squared without any excess.
    """

    standard_deviation: float
    lower: float
    upper: float
    birge_ratio: float | None
    degrees_of_freedom: int
    p_value: float | None

    @property
    def effective_freedom(self) -> float:
        """Degrees of freedom of the statistical u of a mean of the values, excess included.

        With an excess found, the values' own scatter carries u, and its freedom is theirs. Where
        none shows, a small one may hide: `HIDDEN` times that freedom. Without any freedom nothing
        is known of it, and u is taken as stated. By simulation of 4, 5 and 8 values with excess 0,
        1, 1.5 and 3 times their u the 95 % interval so made holds the truth in 93.5 to 99 %.
        """
        if self.degrees_of_freedom == 0:
            return float("inf")
        return self.degrees_of_freedom * (1.0 if self.standard_deviation > 0.0 else HIDDEN)


def excess_scatter(
    values: ArrayLike,
    covariance: ArrayLike,
    design: ArrayLike | None = None,
    *,
    sharing: ArrayLike | None = None,
) -> ExcessScatter:
    """Estimate a random offset of each value, or of each group, beyond the stated covariance.

    Parameters
    ----------
    values : array, shape (K,)
        Such as the means of sessions.
    covariance : array, shape (K, K)
        Their covariance without excess, positive definite.
    design : array, shape (K, p), optional
        What the values have in common; a constant if absent.
    sharing : array, shape (K, K), optional
        1 where two values have the same offset, else 0; each has its own if absent.

    Raises
    ------
    DataError
        If the shapes do not fit or the covariance is not positive definite.

    Notes
    -----
    Maximises the restricted likelihood of V + s² R over s² >= 0, R the sharing (Patterson and
    Thompson 1971, Biometrika 58:545). With no degree of freedom left nothing can be said: s = 0,
    upper = inf. Degrees of freedom are those of the offsets that contrasts see.
    """
    y = np.asarray(values, dtype=np.float64)
    V = np.asarray(covariance, dtype=np.float64)
    X = np.ones((y.size, 1)) if design is None else np.asarray(design, dtype=np.float64)
    if V.shape != (y.size, y.size) or X.shape[0] != y.size:
        raise DataError(
            "values, covariance and design do not fit together",
            value=f"{y.shape}, {V.shape}, {X.shape}",
        )
    contrasts = linalg.null_space(X.T)
    freedom = contrasts.shape[1]
    if freedom == 0:
        return ExcessScatter(0.0, 0.0, float("inf"), None, 0, None)
    # Contrasts see nothing of the common part; simultaneous diagonalisation makes s^2 a scalar.
    scale = float(np.mean(np.diag(V)))
    inner = contrasts.T @ (V / scale) @ contrasts
    R = np.eye(y.size) if sharing is None else np.asarray(sharing, dtype=np.float64)
    try:
        shares, turn = linalg.eigh(contrasts.T @ R @ contrasts, inner)
    except linalg.LinAlgError:
        raise DataError("the covariance of the values is not positive definite") from None
    shares = np.where(shares > _BLIND * shares[-1], shares, 0.0)
    squares = (turn.T @ (contrasts.T @ y)) ** 2 / scale
    seen = int(np.count_nonzero(shares))

    def minus_two_log(excess: float) -> float:
        total = 1.0 + excess * shares
        return float(np.sum(np.log(total) + squares / total))

    ceiling = 10.0 * (float(np.sum(squares)) + 1.0) / float(shares[shares > 0.0].min())
    best = _minimum(minus_two_log, ceiling)
    lower, upper = _profile(minus_two_log, best, ceiling)
    chi = float(np.sum(squares))
    root = np.sqrt(scale)
    return ExcessScatter(
        standard_deviation=float(root * np.sqrt(best)),
        lower=float(root * np.sqrt(lower)),
        upper=float(root * np.sqrt(upper)),
        birge_ratio=float(np.sqrt(chi / freedom)),
        degrees_of_freedom=seen,
        p_value=float(stats.chi2.sf(chi, freedom)),
    )


def _minimum(loss: Callable[[float], float], ceiling: float) -> float:
    grid = np.concatenate(([0.0], np.geomspace(1e-4, ceiling, 80)))
    place = int(np.argmin([loss(x) for x in grid]))
    low, high = grid[max(place - 1, 0)], grid[min(place + 1, grid.size - 1)]
    found = optimize.minimize_scalar(loss, bounds=(low, high), method="bounded")
    return float(found.x) if found.fun < loss(0.0) else 0.0


def _profile(loss: Callable[[float], float], best: float, ceiling: float) -> tuple[float, float]:
    limit = loss(best) + float(stats.chi2.ppf(0.95, 1))

    def above(x: float) -> float:
        return float(loss(x) - limit)

    lower = 0.0 if best == 0.0 or above(0.0) <= 0.0 else float(optimize.brentq(above, 0.0, best))
    top = ceiling
    while above(top) < 0.0 and top < 1e12:
        top *= 10.0
    return lower, float(optimize.brentq(above, best, top)) if above(top) > 0.0 else float("inf")
