"""Partly filled windows: what they expect under power-law noise, and how that is put right.

A curve of raw variances is a mixture v(τ) = Σ θ E_α(τ) of power laws with the expectations E_α of
the windows as they are filled. With the mixture found (θ >= 0), every raw variance is multiplied by
what complete windows would expect over what these do: tr(QC) is then that of complete ones.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy import optimize

from clockgeo.frequency.contrasts import LAWS
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.stability_statistics import Statistic
from clockgeo.frequency.window_expectations import (
    BLOCKS,
    expected_modified,
    expected_squares,
    kernel_by_lag,
)

__all__ = ["WindowExpectations", "noise_mixture"]

_MOST_LAWS = 3
_PRICE = 6.0
"""What a further law must take off the misfit (χ²)."""
_PROBES, _SAMPLES = 150, 32_000
"""Windows whose expectation stands for all where there are more: so many, or as many as hold so
many samples."""
_GOLDEN = 0.6180339887498949
_LONGEST_TABLE = 1_024
"""Averaging factor up to which complete windows are evaluated; beyond, laws are scaled."""
_SLOPES = np.array([-2.0, -2.0, -1.0, 0.0, 1.0])
_MODIFIED_SLOPES = np.array([-3.0, -2.0, -1.0, 0.0, 1.0])


@dataclass(frozen=True, eq=False)
class WindowExpectations:
    """Expectations of one statistic on a record with gaps, by law of unit level.

    Attributes
    ----------
    statistic : Statistic
    count : int32 array, shape (size + 1,)
        Running number of samples.
    starts, stops : int64 array
        Runs without a gap.
    interval : float
        Length of a tick in s.
    """

    statistic: Statistic
    count: NDArray[np.int32]
    starts: NDArray[np.int64]
    stops: NDArray[np.int64]
    interval: float

    def complete(self, m: int) -> NDArray[np.float64]:
        """Expectation of complete windows, shape (5,)."""
        short = min(m, _LONGEST_TABLE)
        size = 3 * short
        count = np.arange(size + 1, dtype=np.int32)
        ends = np.array([0]), np.array([size])
        first = self._expected(count, *ends, np.zeros(1, dtype=np.int64), short, 0.0)
        slopes = _MODIFIED_SLOPES if self._modified else _SLOPES
        found = first * (m / short) ** slopes
        if m > short and not self._modified:
            # 4 S(m) - S(2m) of the structure function of flicker phase, 3/4 (ln(m)/2 + 0.982).
            found[1] *= (np.log(m) + 1.73) / (np.log(short) + 1.73)
        return found

    def partial(self, m: int, stride: int, least: float) -> NDArray[np.float64]:
        """Expectation of windows as they are filled, shape (5,), from some or all of them.

        Parameters
        ----------
        m : int
            Averaging factor.
        stride : int
            Distance of the windows.
        least : float
            Least filling of a window, 0 to 1.
        """
        span = 3 * m - 1 if self._modified else self.statistic.order * m
        places = np.arange(0, self.count.size - span, stride)
        probes = max(_PROBES, _SAMPLES // m)
        if places.size > probes:
            # Spread evenly, yet in step with no pattern of gaps.
            spread = (np.arange(probes) + np.arange(probes) * _GOLDEN % 1.0) / probes
            places = places[(spread * places.size).astype(np.int64)]
        return self._expected(self.count, self.starts, self.stops, places, m, least)

    @property
    def _modified(self) -> bool:
        return self.statistic.kind == "modified"

    def _expected(
        self,
        count: NDArray[np.int32],
        starts: NDArray[np.int64],
        stops: NDArray[np.int64],
        probes: NDArray[np.int64],
        m: int,
        least: float,
    ) -> NDArray[np.float64]:
        order = self.statistic.order
        blocks = min(m, BLOCKS)
        number = 3 * blocks if self._modified else order * blocks
        width = m / blocks * self.interval
        slow = [
            kernel_by_lag(NoiseModel(**{law: 1.0}), number, width, number * width)
            for law in ("flicker_fm", "random_walk_fm")
        ]
        if self._modified:
            # White PM: 2/m³; flicker PM: 3 ln(256/27)/8 of its level, twice for the difference.
            whole = np.array([2.0 / m**3, 0.75 * np.log(256.0 / 27.0) * 0.75 / m**2])
            weights, found = expected_modified(
                count, starts, stops, probes, m, least * m**2, slow[0], slow[1], whole
            )
        else:
            weights, found = expected_squares(
                count, starts, stops, probes, m, order, max(least * m, 1.0), slow[0], slow[1]
            )
        if weights <= 0.0:
            return self.complete(m)
        scale = self.interval ** np.array([-2.0, -2.0, -1.0, 0.0, 0.0])
        return found / weights * scale / (2.0 if order == 2 else 6.0)


def noise_mixture(
    raw: NDArray[np.float64], expected: NDArray[np.float64], freedom: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Squared levels of the five laws, none negative; as few laws as the curve calls for.

    Parameters
    ----------
    raw : float array, shape (K,)
        Variances.
    expected : float array, shape (K, 5)
        Expectations of them under each law of unit level.
    freedom : float array, shape (K,)
        Rough degrees of freedom; the relative variance of a point is 2/edf.

    Notes
    -----
    Laws that partly filled windows make look alike would share the curve by chance, so that each
    has to earn its place.
    """
    weight = np.sqrt(freedom / 2.0)
    matrix = expected / raw[:, None] * weight[:, None]
    scale = np.maximum(matrix.max(axis=0), 1e-300)
    best, lowest = np.zeros(len(LAWS)), np.inf
    for size in range(1, _MOST_LAWS + 1):
        for laws in map(list, combinations(range(len(LAWS)), size)):
            found, misfit = optimize.nnls(matrix[:, laws] / scale[laws], weight)
            score = misfit**2 + _PRICE * size
            if score < lowest and np.all(found > 0.0):
                best, lowest = np.zeros(len(LAWS)), score
                best[laws] = found / scale[laws]
    return best
