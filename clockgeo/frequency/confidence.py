"""Equivalent degrees of freedom of deviations of complete records, and chi-squared intervals."""

from __future__ import annotations

from math import comb

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from clockgeo.errors import DataError
from clockgeo.frequency.stability_statistics import Statistic

__all__ = ["ALPHA_OF_LAW", "LAW_OF_ALPHA", "chi_squared_interval", "freedom_of"]

LAW_OF_ALPHA = {
    2: "white_pm",
    1: "flicker_pm",
    0: "white_fm",
    -1: "flicker_fm",
    -2: "random_walk_fm",
    -3: "flicker_walk_fm",
    -4: "random_run_fm",
}
"""Exponent of S_y = h f^α -> name of the law."""
ALPHA_OF_LAW = {law: alpha for alpha, law in LAW_OF_ALPHA.items()}

_TOTAL = {0: (1.50, 0.0), -1: (1.17, 0.22), -2: (0.93, 0.36)}
_MODIFIED_TOTAL = {
    2: (1.90, 2.10),
    1: (1.20, 1.40),
    0: (1.10, 1.20),
    -1: (0.85, 0.50),
    -2: (0.75, 0.31),
}
_HADAMARD_TOTAL = {
    0: (0.559, 1.004),
    -1: (0.868, 1.140),
    -2: (0.938, 1.696),
    -3: (0.974, 2.554),
    -4: (1.276, 3.149),
}
"""Constants of the total statistics; Howe, Greenhall and others in NIST SP 1065 (from memory)."""

_OVERLAP = 100
"""Windows per averaging time beyond which more overlap adds no freedom."""


def freedom_of(statistic: Statistic, alpha: int, m: int, samples: int) -> float:
    """Equivalent degrees of freedom of a deviation of a complete record.

    Parameters
    ----------
    statistic : Statistic
    alpha : int
        Exponent of the noise, 2 to -2 (to -4 for the Hadamard family).
    m : int
        Averaging factor.
    samples : int
        Frequency samples in the record.

    Returns
    -------
    float
        At least 1.

    Notes
    -----
    Greenhall and Riley 2003 (35th PTTI; from memory) for differences, with the sampled-phase form
    (F to infinity) for α <= 0, which is exact to 1 % where the averaged-phase form errs by up to
    17 %; empirical constants for the total family.
    """
    if statistic.total:
        return max(_total_freedom(statistic, alpha, m, samples), 1.0)
    modified = statistic.kind == "modified" and m > 1  # with m = 1 it is the plain one
    filter_factor = 1.0 if modified else (np.inf if alpha <= 0 else float(m))
    stride = 1 if statistic.kind == "plain" else min(m, _OVERLAP)
    return max(
        _difference_freedom(alpha, statistic.order, m, samples + 1, filter_factor, stride), 1.0
    )


def _total_freedom(statistic: Statistic, alpha: int, m: int, samples: int) -> float:
    ratio = samples / m
    if statistic.order == 3:
        b0, b1 = _HADAMARD_TOTAL[min(max(alpha, -4), 0)]
        return float(ratio / (b0 + b1 / ratio))
    if statistic.kind == "modified-total":
        b, c = _MODIFIED_TOTAL[min(max(alpha, -2), 2)]
    else:
        b, c = _TOTAL[min(max(alpha, -2), 0)]
    return float(b * ratio - c)


def _difference_freedom(
    alpha: int, order: int, m: int, phases: int, filter_factor: float, stride: int
) -> float:
    # One phase more than the reach of a difference, and m for the average of the modified kind.
    length = m * order + max(m / filter_factor, 1.0)
    number = 1 + int(np.floor(stride * (phases - length) / m))
    if number < 1:
        raise DataError(
            "the averaging time is too long for the record",
            value=f"{m} of {phases - 1} samples",
        )
    if alpha == 2 and filter_factor > 1.0:
        # White phase: only windows that share a phase are correlated, whatever the overlap.
        full = 1 + phases - int(length) if stride > 1 else number
        per_length = full / m if stride > 1 else float(number)
        first = comb(4 * order, 2 * order) / comb(2 * order, order) ** 2
        return float(full / (first - order / 2.0 / max(per_length, 1.0)))
    reach = min(number, (order + 1) * stride)
    lags = np.arange(reach + 1) / stride
    shape = _covariance_shape(lags, alpha, order, filter_factor)
    squares = (shape / shape[0]) ** 2
    inner = 2.0 * np.sum((1.0 - np.arange(1, reach) / number) * squares[1:reach])
    return float(number / (1.0 + (1.0 - reach / number) * squares[reach] + inner))


def _covariance_shape(
    t: NDArray[np.float64], alpha: int, order: int, filter_factor: float
) -> NDArray[np.float64]:
    """s_z(t): autocovariance of the differences, up to a factor."""
    binomial = [(-1) ** k * comb(2 * order, order + k) for k in range(-order, order + 1)]
    shifts = np.arange(-order, order + 1)

    def s_x(u: NDArray[np.float64]) -> NDArray[np.float64]:
        if not np.isfinite(filter_factor):
            return _s_w(u, alpha + 2)
        step = 1.0 / filter_factor
        inner = 2.0 * _s_w(u, alpha) - _s_w(u - step, alpha) - _s_w(u + step, alpha)
        return np.asarray(filter_factor**2 * inner)

    return np.asarray(sum(c * s_x(t + k) for c, k in zip(binomial, shifts, strict=True)))


def _s_w(t: NDArray[np.float64], alpha: int) -> NDArray[np.float64]:
    """Generalised autocovariance of doubly integrated phase."""
    size = np.abs(t)
    log = np.log(np.maximum(size, 1e-300))
    return np.asarray(
        {
            2: -size,
            1: size**2 * log,
            0: size**3,
            -1: -(size**4) * log,
            -2: -(size**5),
            -3: size**6 * log,
            -4: size**7,
        }[alpha]
    )


def chi_squared_interval(deviation: float, freedom: float, level: float) -> tuple[float, float]:
    """Interval of the true deviation: σ √(edf/χ²) at both ends.

    Parameters
    ----------
    deviation : float
        Estimate.
    freedom : float
        Its equivalent degrees of freedom.
    level : float
        Probability that the interval holds the truth, between 0 and 1.

    Raises
    ------
    DataError
        If the level is no probability.
    """
    if not 0.0 < level < 1.0:
        raise DataError("a confidence level lies between 0 and 1", value=level)
    tail = (1.0 - level) / 2.0
    lower = deviation * np.sqrt(freedom / stats.chi2.isf(tail, freedom))
    upper = deviation * np.sqrt(freedom / stats.chi2.ppf(tail, freedom))
    return float(lower), float(upper)
