"""Correlations between session means, split by what causes them, to be reported and checked.

    r = Σ_k s_1k s_2k u_1k u_2k / (u_1 u_2)  over shared effects k,  plus the statistical part.

Margolis and Gill 2015, Metrologia 52, 628, on why ratios must be reported with them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from clockgeo.levelling.linear_model import LinearModel

__all__ = ["Correlation", "correlations_of", "overlap_covariance"]

_SMALL = 1e-9


@dataclass(frozen=True)
class Correlation:
    """Correlation coefficient of two observations and its parts.

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


def correlations_of(model: LinearModel, rows: Sequence[str]) -> list[Correlation]:
    """Correlations of all pairs of rows that have any.

    Parameters
    ----------
    model : LinearModel
    rows : sequence of str
        Ids of observations.
    """
    place = {row: i for i, row in enumerate(model.rows)}
    chosen = [place[row] for row in rows]
    noise = model.noise[chosen][:, chosen].toarray()
    loads = model.loading[chosen].toarray()
    u = np.sqrt(np.diag(noise) + np.sum(loads**2, axis=1))
    found = []
    for i, j in combinations(range(len(chosen)), 2):
        scale = u[i] * u[j]
        if scale == 0.0:
            continue
        shared = loads[i] * loads[j] / scale
        parts = {str(model.effects[k]): float(shared[k]) for k in np.flatnonzero(shared)}
        statistical = float(noise[i, j] / scale)
        if abs(statistical) > _SMALL:
            parts["noise of clocks and links"] = statistical
        if parts:
            found.append(Correlation(rows[i], rows[j], float(sum(parts.values())), parts))
    return found


def overlap_covariance(
    first: NDArray[np.int64], second: NDArray[np.int64], interval: float, white_fm: float
) -> float:
    """Covariance of two means that one oscillator's white noise has in common.

    Parameters
    ----------
    first, second : int64 array
        Ticks of the valid samples of both, on one line.
    interval : float
        Length of a tick in s.
    white_fm : float
        Allan deviation of the oscillator's white FM at 1 s.

    Returns
    -------
    float
        σ² T_overlap/(T1 T2); for equal oscillators the correlation is T_overlap/√(T1 T2).
    """
    if first[-1] < second[0] or second[-1] < first[0]:
        return 0.0
    common = np.intersect1d(first, second, assume_unique=True).size * interval
    return float(white_fm**2 * common / (first.size * interval * second.size * interval))
