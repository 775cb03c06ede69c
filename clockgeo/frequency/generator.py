"""Power-law noise drawn with exactly the stated levels."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import fft

from clockgeo.errors import DataError
from clockgeo.frequency.noise import NoiseModel

__all__ = ["draw_noise"]


def draw_noise(
    model: NoiseModel, count: int, interval: float, rng: np.random.Generator
) -> NDArray[np.float64]:
    """Draw fractional frequency noise of a power-law model, averaged over each interval.

    Parameters
    ----------
    model : NoiseModel
        Levels and drift.
    count : int
        Number of samples, >= 1.
    interval : float
        Sampling interval in s, > 0.
    rng : numpy.random.Generator
        Source of chance.

    Returns
    -------
    float array, shape (count,)
        y, dimensionless; the drift is zero at the middle.

    Raises
    ------
    DataError
        If `count` or `interval` is not positive.

    Notes
    -----
    Each law is white noise through the filter (1 - z^-1)^(-b) (Kasdin 1995, Proc. IEEE 83:802,
    eq. 112), applied by FFT over twice the length so that nothing wraps around.
    """
    if count < 1 or not interval > 0.0:
        raise DataError("noise needs samples", value=f"{count} samples every {interval} s")
    y = np.zeros(count)
    white = model.white_fm / np.sqrt(interval)
    if white:
        y += white * rng.standard_normal(count)
    if model.flicker_fm:
        # S_y = h-1/f; a filter of order 1/2 on unit white noise gives S = 2 tau0 / (2 pi f tau0).
        level = np.sqrt(model.flicker_fm**2 / (2.0 * np.log(2.0)) * np.pi)
        y += level * _filtered(rng, count, 0.5)
    if model.random_walk_fm:
        # Steps of variance 2 pi^2 h-2 tau0 and the mean within an interval.
        h = model.random_walk_fm**2 * 3.0 / (2.0 * np.pi**2)
        y += np.cumsum(np.sqrt(2.0 * np.pi**2 * h * interval) * rng.standard_normal(count))
    if model.white_pm:
        phase = model.white_pm / np.sqrt(3.0) * rng.standard_normal(count + 1)
        y += np.diff(phase) / interval
    if model.flicker_pm:
        phase = _filtered(rng, count + 1, 0.5)
        spread = np.sqrt(np.mean((phase[2:] - 2 * phase[1:-1] + phase[:-2]) ** 2) / 2.0)
        y += model.flicker_pm * np.diff(phase) / (spread or 1.0) / interval
    return y + model.drift * interval * (np.arange(count) - (count - 1) / 2.0)


def _filtered(rng: np.random.Generator, count: int, order: float) -> NDArray[np.float64]:
    steps = np.arange(1, count)
    response = np.concatenate(([1.0], np.cumprod((steps - 1 + order) / steps)))
    size = fft.next_fast_len(2 * count, real=True)
    white = rng.standard_normal(count)
    return np.asarray(fft.irfft(fft.rfft(response, size) * fft.rfft(white, size), size)[:count])
