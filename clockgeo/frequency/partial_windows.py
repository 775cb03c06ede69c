"""Partly filled windows: what they expect under power-law noise, and how sure they are.

A curve of raw variances is a mixture v(τ) = Σ θ E_α(τ) of power laws with the expectations E_α of
the windows as they are filled. With the mixture found (θ >= 0), every raw variance is multiplied by
what complete windows would expect over what these do; and the equivalent degrees of freedom are
those of the quadratic form under the mixture.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy import optimize

from clockgeo.frequency.contrasts import (
    LAWS,
    contrast_variances,
    contrast_weights,
    equivalent_freedom,
)
from clockgeo.frequency.mean import block_kernel
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.stability_statistics import Statistic

__all__ = ["Corrected", "PartialWindows"]

_MOST_LAWS = 3
_PRICE = 6.0
"""What a further law must take off the misfit (χ²)."""
_PROBES = 40
"""Windows whose expectation stands for all."""
_TRIES = 1200
_STRETCH, _SHORTEST, _STRETCHES = 40, 200, 4
"""Stretches whose freedom stands for a long record: averaging times, ticks, and how many."""
_STEPS = 4
_BLOCKS = 16
"""Blocks of an averaging time in that form, and steps at which its windows are placed."""


@dataclass(frozen=True, eq=False)
class Corrected:
    """Variances with their expectation put right; arrays of shape (K,)."""

    variance: NDArray[np.float64]
    edf: NDArray[np.float64]
    noise: tuple[str, ...]


class PartialWindows:
    """Windows of one statistic on a record with gaps.

    Parameters
    ----------
    statistic : Statistic
    tick : int64 array, shape (N,)
        Places of the samples, from 0.
    size : int
        Ticks from the first to the last.
    interval : float
        Length of a tick in s.
    """

    def __init__(
        self, statistic: Statistic, tick: NDArray[np.int64], size: int, interval: float
    ) -> None:
        self.statistic, self.tick, self.size, self.interval = statistic, tick, size, interval
        self.modified = statistic.kind == "modified"

    def corrected(
        self,
        factors: Sequence[int],
        raw: NDArray[np.float64],
        partial: NDArray[np.bool_],
        count: NDArray[np.int64],
        least: float,
    ) -> Corrected:
        """Put raw variances right.

        Parameters
        ----------
        factors : sequence of int
            Averaging factors.
        raw : float array, shape (K,)
        partial : bool array, shape (K,)
            Whether partly filled windows took part.
        count : int array, shape (K,)
            Windows that took part.
        least : float
            Least filling that was asked of partly filled windows, as a share.
        """
        whole = np.array([self._complete(m) for m in factors])
        expected = whole.copy()
        for place, m in enumerate(factors):
            if partial[place]:
                expected[place] = self._probed(m, least)
        guess = np.maximum(np.minimum(count, self.tick.size / np.array(factors)), 1.0)
        levels = _mixture(raw, expected, guess)
        variance = raw * (whole @ levels) / (expected @ levels)
        shares = whole * levels
        ruling = [LAWS[int(place)] for place in np.argmax(shares, axis=1)]
        edf = [
            self._freedom(m, levels, least if partly else 1.0)
            for m, partly in zip(factors, partial, strict=True)
        ]
        return Corrected(variance, np.array(edf), tuple(ruling))

    def _span(self, m: int) -> int:
        return 3 * m - 1 if self.modified else self.statistic.order * m

    def _scale(self) -> float:
        return 0.5 if self.statistic.order == 2 else 1.0 / 6.0

    def _variances(self, mask: NDArray[np.bool_], m: int) -> NDArray[np.float64]:
        weights = contrast_weights(mask, m, order=self.statistic.order, modified=self.modified)
        return self._scale() * contrast_variances(weights, m, self.interval)

    def _complete(self, m: int) -> NDArray[np.float64]:
        """Expectation of complete windows under each law of unit level, shape (5,)."""
        return self._variances(np.ones(self._span(m), dtype=bool), m)

    def _mask(self, start: int, length: int) -> NDArray[np.bool_]:
        low, high = np.searchsorted(self.tick, [start, start + length])
        mask = np.zeros(length, dtype=bool)
        mask[self.tick[low:high] - start] = True
        return mask

    def _filled(self, mask: NDArray[np.bool_], m: int, least: float) -> float:
        """Weight of a window among the others; 0 if it is not filled well enough."""
        if self.modified:
            triangle = np.convolve(np.ones(m), np.ones(m))
            parts = np.array([mask[: 2 * m - 1] @ triangle, mask[m:] @ triangle]) / m**2
        else:
            parts = mask.reshape(self.statistic.order, m).mean(axis=1)
        if np.any(parts < max(least, 1e-12)):
            return 0.0
        shape = np.array([1.0, 1.0] if self.statistic.order == 2 else [1.0, 4.0, 1.0])
        return float(1.0 / np.sum(shape / parts))

    def _probed(self, m: int, least: float) -> NDArray[np.float64]:
        """Weighted expectation of windows as they are filled, from some of them."""
        length = self._span(m)
        starts = np.unique(np.linspace(0, self.size - length, _TRIES).astype(np.int64))
        # Spread the windows that are looked at over the record, whichever are filled.
        order = np.argsort((np.arange(starts.size) * 0.6180339887498949) % 1.0, kind="stable")
        total, weight, probes = np.zeros(len(LAWS)), 0.0, 0
        for start in starts[order]:
            mask = self._mask(int(start), length)
            filled = self._filled(mask, m, least)
            if filled == 0.0:
                continue
            total += filled * self._variances(mask, m)
            weight += filled
            probes += 1
            if probes == _PROBES:
                break
        return total / weight if weight else self._complete(m)

    def _freedom(self, m: int, levels: NDArray[np.float64], least: float) -> float:
        """Equivalent degrees of freedom of the windows that took part.

        The whole quadratic form where the record holds few averaging times; else the forms of some
        stretches, of which the record holds so many.
        """
        stretch = max(_STRETCH * m, _SHORTEST)
        if self.size <= 2 * stretch:
            return max(self._freedom_within(0, self.size, m, levels, least), 1.0)
        starts = np.linspace(0, self.size - stretch, _STRETCHES).astype(np.int64)
        each = [self._freedom_within(int(one), stretch, m, levels, least) for one in starts]
        return max(float(np.mean(each)) * self.size / stretch, 1.0)

    def _freedom_within(
        self, first: int, ticks: int, m: int, levels: NDArray[np.float64], least: float
    ) -> float:
        length = self._span(m)
        step = m if self.statistic.kind == "plain" else max(1, m // _STEPS)
        width = max(1, m // _BLOCKS)
        blocks = -(-ticks // width)
        rows, weights = [], []
        for start in range(0, ticks - length + 1, step):
            mask = self._mask(first + start, length)
            filled = self._filled(mask, m, least)
            if filled == 0.0:
                continue
            shape = contrast_weights(mask, m, order=self.statistic.order, modified=self.modified)
            places = (start + np.arange(length)) // width
            rows.append(np.bincount(places, weights=shape, minlength=blocks))
            weights.append(filled)
        if not rows:
            return 0.0
        low, high = np.searchsorted(self.tick, [first, first + ticks])
        filling = np.bincount((self.tick[low:high] - first) // width, minlength=blocks)
        covariance = self._block_covariance(levels, filling, width)
        return equivalent_freedom(np.array(rows), covariance, np.array(weights))

    def _block_covariance(
        self, levels: NDArray[np.float64], filling: NDArray[np.int64], width: int
    ) -> NDArray[np.float64]:
        """Covariance for weights summed over blocks of `filling` samples, under the mixture."""
        names = dict(zip(LAWS, np.sqrt(levels), strict=True))
        model = NoiseModel(**{law: float(names[law]) for law in ("flicker_fm", "random_walk_fm")})
        places = np.arange(filling.size, dtype=np.int64)
        span = filling.size * width * self.interval
        covariance = block_kernel(model, places, width * self.interval, span)
        white = levels[LAWS.index("white_fm")] / self.interval
        phase = (levels[0] + levels[1]) * 2.0 / 3.0 / self.interval**2
        # Sums of n weights w/n: independent noise of a block falls with the samples it holds, phase
        # noise with their square, and neighbours share a phase.
        held = np.maximum(filling, 1).astype(np.float64)
        covariance += np.diag(white / held + phase / held**2)
        if width == 1 and phase:
            both = (filling[1:] > 0) & (filling[:-1] > 0)
            shared = np.where(both, -phase / 2.0, 0.0)
            covariance += np.diag(shared, 1) + np.diag(shared, -1)
        return np.asarray(covariance)


def _mixture(
    raw: NDArray[np.float64], expected: NDArray[np.float64], freedom: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Squared levels of the five laws, none negative; as few laws as the curve calls for.

    The relative variance of a point is 2/edf. Laws that partly filled windows make look alike would
    share the curve by chance, so that each has to earn its place.
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
