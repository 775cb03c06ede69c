"""Quadratic forms: squares of contrasts of samples, and how many degrees of freedom they have."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["LAWS", "equivalent_freedom"]

LAWS = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm")
"""Power laws in the order of all arrays of levels and expectations."""


def equivalent_freedom(
    contrasts: NDArray[np.float64],
    covariance: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Equivalent degrees of freedom of a weighted mean of squared contrasts: tr(QC)²/tr(QCQC).

    Parameters
    ----------
    contrasts : float array, shape (P, N)
        Weights of the samples, each row adding up to zero.
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
