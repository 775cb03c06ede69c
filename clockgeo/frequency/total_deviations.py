"""Deviations of a record that is extended by reflection: the total family.

They use a record's ends better at long averaging times. What reflection does to the expectation is
taken off with published factors that depend on the noise. Definitions: Greenhall, Howe and Percival
1999 (IEEE UFFC 46:1183) for total, Howe and Vernotte 1999 (31st PTTI) for modified total, Howe et
al. 2000 (32nd PTTI) for Hadamard total; NIST SP 1065 (2008).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.total_sums import odd_reflection_squares, segment_squares

__all__ = ["total_bias", "total_variance"]

_MOST_STEPS = 100_000_000
"""Samples times averaging factor up to which every segment of a record counts."""

_TOTAL = {0: 0.0, -1: 1.0 / (3.0 * np.log(2.0)), -2: 0.75}
_MODIFIED_TOTAL = {2: 0.94, 1: 0.83, 0: 0.73, -1: 0.70, -2: 0.69}
_HADAMARD_TOTAL = {0: 0.005, -1: 0.149, -2: 0.229, -3: 0.283, -4: 0.321}
"""Published expectations against the plain variances; rounded simulation values, right to 2-6 %."""


def total_variance(
    y: NDArray[np.float64], m: int, *, order: int, modified: bool
) -> tuple[float, int]:
    """Total variance of a complete record, bias not taken off, and the number of squares in it.

    Parameters
    ----------
    y : float array, shape (N,)
        Fractional frequency without gaps.
    m : int
        Averaging factor.
    order : int
        2 for the Allan family, 3 for Hadamard.
    modified : bool
        Whether the modified statistic is meant (order 2).
    """
    if order == 3:
        if m == 1:  # no averaging: reflection adds nothing, the plain statistic is meant
            differences = y[2:] - 2.0 * y[1:-1] + y[:-2]
            return float(np.mean(differences**2) / 6.0), int(differences.size)
        squares, number = segment_squares(y, m, _stride(y.size, m))
        return squares / number / 6.0, number
    phase = np.concatenate(([0.0], np.cumsum(y - y.mean())))
    if modified:
        squares, number = segment_squares(phase, m, _stride(y.size, m))
        return squares / number / (2.0 * m**2), number
    number = phase.size - 2
    return odd_reflection_squares(phase, m) / (2.0 * m**2 * number), number


def _stride(samples: int, m: int) -> int:
    """Every segment of short records; of long ones as many as 10^8 steps allow, 16 a length."""
    return int(min(-(-samples * m // _MOST_STEPS), max(m // 16, 1)))


def total_bias(alpha: int, m: int, samples: int, *, order: int, modified: bool) -> float:
    """Expectation of a total variance over that of the plain one under a power law.

    Parameters
    ----------
    alpha : int
        Exponent of the noise.
    m, samples : int
        Averaging factor and length of the record.
    order : int
    modified : bool
    """
    if modified:
        return _MODIFIED_TOTAL[min(max(alpha, -2), 2)]
    if order == 3:
        return 1.0 - (_HADAMARD_TOTAL[min(max(alpha, -4), 0)] if m > 1 else 0.0)
    return float(1.0 - _TOTAL[min(max(alpha, -2), 0)] * m / samples)
