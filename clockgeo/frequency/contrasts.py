"""What power-law noise lets a combination of samples scatter: expectations of quadratic forms.

A deviation is a mean of squares of contrasts, combinations of samples whose weights add up to zero.
With samples missing, a contrast of partly filled windows has another expectation than one of
complete windows; both follow from the weights and the covariance of the noise (tr QC).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from clockgeo.frequency.mean import block_kernel
from clockgeo.frequency.noise import NoiseModel

__all__ = ["LAWS", "contrast_variances", "contrast_weights", "equivalent_freedom"]

LAWS = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm")
"""Laws in the order of the columns of `contrast_variances`."""

_BLOCKS_OF_A_WINDOW = 64
_PM_LAGS = 256
_PM_WINDOW = 4096
"""Longest window for which flicker PM is told from white PM in partly filled windows."""


def contrast_weights(
    mask: NDArray[np.bool_], m: int, *, order: int, modified: bool
) -> NDArray[np.float64]:
    """Weights of the samples in one contrast, shape of `mask`; 0 where there is no sample.

    Parameters
    ----------
    mask : bool array, shape (2m,), (3m,) or (3m - 1,)
        Which samples are there: two windows, three of them for order 3, or the reach of two
        triangles for the modified statistic.
    m : int
        Length of a window.
    order : int
        2 for differences of averages, 3 for second differences.
    modified : bool
        Whether windows are triangles, as in the modified Allan deviation.
    """
    here = mask.astype(np.float64)
    if modified:
        triangle = np.convolve(np.ones(m), np.ones(m))
        early, late = np.zeros(here.size), np.zeros(here.size)
        early[: 2 * m - 1], late[m:] = triangle, triangle
        early, late = early * here, late * here
        return np.asarray(late / late.sum() - early / early.sum())
    coefficients = (-1.0, 1.0) if order == 2 else (1.0, -2.0, 1.0)
    parts = here.reshape(len(coefficients), m)
    scaled = np.array(coefficients)[:, None] * parts / parts.sum(axis=1, keepdims=True)
    return np.asarray(scaled.ravel())


def contrast_variances(
    weights: NDArray[np.float64], m: int, interval: float
) -> NDArray[np.float64]:
    """Variance of one contrast under each law of unit level, shape (5,).

    Parameters
    ----------
    weights : float array, shape (K,)
        Of neighbouring ticks, adding up to zero.
    m : int
        Averaging factor; slow laws are evaluated on blocks of m/64 ticks.
    interval : float
        Length of a tick in s.
    """
    white = float(np.sum(weights**2))
    neighbours = float(weights[1:] @ weights[:-1])
    phase = 2.0 / 3.0 * (white - neighbours) / interval**2
    flicker_phase = phase
    if m <= _PM_WINDOW:
        covariance = _flicker_phase_covariance()
        lags = min(_PM_LAGS, weights.size)
        products = np.array([weights[lag:] @ weights[: weights.size - lag] for lag in range(lags)])
        products[1:] *= 2.0
        flicker_phase = float(covariance[:lags] @ products) / interval**2
    width = max(1, m // _BLOCKS_OF_A_WINDOW)
    starts = np.arange(0, weights.size, width)
    coarse = np.add.reduceat(weights, starts)
    places = np.arange(starts.size, dtype=np.int64)
    span = weights.size * interval
    slow = [
        float(
            coarse @ block_kernel(NoiseModel(**{law: 1.0}), places, width * interval, span) @ coarse
        )
        for law in ("flicker_fm", "random_walk_fm")
    ]
    return np.array([phase, flicker_phase, white / interval, *slow])


@lru_cache(maxsize=1)
def _flicker_phase_covariance() -> NDArray[np.float64]:
    """Autocovariance of y under flicker phase noise with unit Allan deviation at one tick."""
    frequency = (np.arange(1 << 16) + 0.5) / (1 << 17)
    density = 4.0 * np.sin(np.pi * frequency) ** 2 / frequency
    lags = np.arange(_PM_LAGS)
    values = np.array([np.mean(density * np.cos(2 * np.pi * frequency * lag)) for lag in lags])
    return np.asarray(values / (values[0] - values[1]))


def equivalent_freedom(
    contrasts: NDArray[np.float64],
    covariance: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Equivalent degrees of freedom of a weighted mean of squared contrasts: tr(QC)²/tr(QCQC).

    Parameters
    ----------
    contrasts : float array, shape (P, N)
    covariance : float array, shape (N, N)
        Of the samples; for noise without a variance any generalised covariance will do.
    weights : float array, shape (P,), optional
        Of the squares; equal if not given.

    Notes
    -----
    Two-moment match of a quadratic form of normal variables with a multiple of chi-squared; exact
    in mean and variance.
    """
    w = np.ones(len(contrasts)) if weights is None else weights
    inner = contrasts @ covariance @ contrasts.T
    return float((w @ np.diag(inner)) ** 2 / (w @ (inner**2) @ w))
