"""Robust adjustment: rows that do not fit lose weight instead of being taken out by hand.

Standardised residuals t (over a scale from their median absolute deviation) set factors of the
rows' weights, and the net is adjusted anew until these rest. It finds many blunders at once but
says nothing of what could not be found; minimal detectable biases do.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.network.adjustment import Adjustment, adjust_network
from clockgeo.network.reliability import reliability_of
from clockgeo.network.zero_definition import ZeroRule

__all__ = ["RobustAdjustment", "adjust_robustly", "weight_factors"]

Rule = Literal["huber", "igg3"]
_LEAST = 1e-6
"""Factor that stands for a row left out; it keeps every unknown determined."""
_NORMAL_MAD = 0.674489750196082
"""Median absolute deviation of a standard normal variable."""


@dataclass(frozen=True, eq=False)
class RobustAdjustment:
    """A robust adjustment and the factors it gave to the rows.

    Attributes
    ----------
    adjustment : Adjustment
        The last one; its u hold for the factors as if they were known.
    factors : float array, shape (n,)
        1 for rows that fit, towards 0 for those that do not.
    scale : float
        Scale of the standardised residuals; 1 where the stated uncertainties hold.
    rounds : int
    """

    adjustment: Adjustment
    factors: NDArray[np.float64]
    scale: float
    rounds: int


def weight_factors(
    standardised: NDArray[np.float64], rule: Rule, *, full: float = 2.0, none: float = 5.0
) -> NDArray[np.float64]:
    """Factor of a row's weight from its standardised residual t.

    Parameters
    ----------
    standardised : float array
    rule : {"huber", "igg3"}
        Huber 1964, Ann. Math. Statist. 35:73: min(1, k0/|t|). IGG III (Yang 1999, Commun. Statist.
        28:2329; from memory): k0/|t| ((k1 - |t|)/(k1 - k0))² between k0 and k1, 0 beyond k1.
    full, none : float
        k0, up to which a row keeps its weight, and k1.
    """
    size = np.maximum(np.abs(standardised), 1e-300)
    bounded = np.minimum(1.0, full / size)
    if rule == "huber":
        return np.asarray(bounded)
    fading = np.clip((none - size) / (none - full), 0.0, 1.0) ** 2
    return np.where(size <= full, 1.0, bounded * fading)


def adjust_robustly(
    model: LinearModel,
    *,
    rule: Rule = "igg3",
    full: float = 2.0,
    none: float = 5.0,
    zero: ZeroRule | None = None,
    rounds: int = 50,
) -> RobustAdjustment:
    """Adjust a network robustly.

    Parameters
    ----------
    model : LinearModel
    rule, full, none
        See `weight_factors`; IGG III begins with a few rounds of Huber's rule.
    zero : ZeroRule, optional
        See `adjust_network`.
    rounds : int
        Most rounds; the factors must rest within 0.001 by then.

    Raises
    ------
    DataError
        If the limits are out of order or the factors do not come to rest.
    """
    if not 0.0 < full < none:
        raise DataError(
            "the limits of a robust rule are out of order",
            value=f"full weight to {full}, none beyond {none}",
            allowed="0 < full < none",
        )
    adjustment = adjust_network(model, zero=zero)
    plain = reliability_of(adjustment)
    weight = adjustment.system.whitener.T @ adjustment.system.whitener
    here = plain.controlled
    factors = np.ones(len(model.rows))
    scale, change = 1.0, 1.0
    for step in range(1, rounds + 1):
        misfit = np.where(np.isin(np.arange(here.size), adjustment.system.exact), 0.0, 1.0)
        pull = weight @ (adjustment.residuals * misfit)
        t = np.zeros(here.size)
        t[here] = pull[here] / np.sqrt(plain.sharpness[here])
        scale = max(float(np.median(np.abs(t[here]))) / _NORMAL_MAD, 1.0) if here.any() else 1.0
        used: Rule = "huber" if step <= 5 else rule
        fresh = np.ones(here.size)
        fresh[here] = weight_factors(t[here] / scale, used, full=full, none=none)
        fresh = np.maximum(fresh, _LEAST)
        change = float(np.max(np.abs(fresh - factors), initial=0.0))
        factors = fresh
        adjustment = adjust_network(
            model, zero=zero, row_weights=factors, known=adjustment.identifiability
        )
        if step > 5 and change < 1e-3:
            return RobustAdjustment(adjustment, factors, scale, step)
    raise DataError(
        "the robust weights do not come to rest",
        value=f"still changing by {change:.2g} after {rounds} rounds",
        advice="Allow more rounds, widen the limits, or use rule huber",
    )
