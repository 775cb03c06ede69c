"""Correlations of what a campaign finds, split by what causes them, to be reported and checked.

    r = Σ_k s_1k s_2k u_1k u_2k / (u_1 u_2)  over shared effects k,  plus the noise in common.

Margolis and Gill 2015, Metrologia 52, 628, on why ratios must be reported with them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from clockgeo.levelling.linear_model import LinearModel

__all__ = ["Correlation", "correlations_of", "single_rows"]

_SMALL = 1e-9
_NOISE_OF = {
    "clock": "noise of clocks and links",
    "known": "known number of the reference site",
}


@dataclass(frozen=True)
class Correlation:
    """Correlation coefficient of two quantities and its parts.

    Attributes
    ----------
    first, second : str
    coefficient : float
    parts : dict of str to float
        Cause -> part of the coefficient; they add up to it.
    """

    first: str
    second: str
    coefficient: float
    parts: dict[str, float]


def single_rows(model: LinearModel, rows: Sequence[str]) -> dict[str, NDArray[np.float64]]:
    """Weights of the named observations themselves, for `correlations_of`."""
    identity = np.eye(len(model.rows))
    place = {row: i for i, row in enumerate(model.rows)}
    return {row: identity[place[row]] for row in rows}


def correlations_of(
    model: LinearModel, quantities: Mapping[str, NDArray[np.float64]]
) -> list[Correlation]:
    """Correlations of all pairs of quantities that have any.

    Parameters
    ----------
    model : LinearModel
    quantities : mapping of str to float array, shape (n,)
        Name -> weight of every observation in it; an observation itself has a single 1, an
        estimate its row of the solution's gain.

    Returns
    -------
    list of Correlation
        Effects by name; noise by what kind of observation brings it in.
    """
    names = list(quantities)
    if len(names) < 2:
        return []
    weights = np.array([quantities[name] for name in names])
    loads = np.asarray(weights @ model.loading.toarray())
    noise = _noise_by_kind(model, weights)
    u = np.sqrt(sum(np.diag(block) for block in noise.values()) + np.sum(loads**2, axis=1))
    found = []
    for i, j in combinations(range(len(names)), 2):
        scale = u[i] * u[j]
        if scale == 0.0:
            continue
        shared = loads[i] * loads[j] / scale
        parts = {
            str(model.effects[k]): float(shared[k]) for k in np.flatnonzero(np.abs(shared) > _SMALL)
        }
        for cause, block in noise.items():
            if abs(block[i, j] / scale) > _SMALL:
                parts[cause] = float(block[i, j] / scale)
        if parts:
            found.append(Correlation(names[i], names[j], float(sum(parts.values())), parts))
    return found


def _noise_by_kind(
    model: LinearModel, weights: NDArray[np.float64]
) -> dict[str, NDArray[np.float64]]:
    """Covariance of the quantities through the noise of each kind of observation."""
    kinds = np.array(model.kinds)
    blocks = {}
    for kind in dict.fromkeys(model.kinds):
        alone = np.where(kinds == kind, weights, 0.0)
        cause = _NOISE_OF.get(kind, f"noise of {kind} observations")
        blocks[cause] = np.asarray(alone @ (model.noise @ alone.T))
    return blocks
