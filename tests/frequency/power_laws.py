"""Power-law noise from its spectrum, independent of the generator of the package.

Frequency noise with S_y = h f^α, drawn as Fourier coefficients of a much longer periodic line of
which a piece is taken; averaged over a tick by drawing phase and differencing it.
"""

from __future__ import annotations

import numpy as np

LAWS = {
    2: "white_pm",
    1: "flicker_pm",
    0: "white_fm",
    -1: "flicker_fm",
    -2: "random_walk_fm",
}
_LONGER = 8


def power_law(alpha, count, rng):
    """Fractional frequency with the spectrum f^alpha up to half the sampling rate, shape (count,).

    White phase, white frequency and random walk are exact sums of white noise; the flicker noises
    are sums over frequencies with the phase spectrum of a discrete fractional difference.
    """
    if alpha == 2:
        return np.diff(rng.standard_normal(count + 1))
    if alpha == 0:
        return rng.standard_normal(count)
    if alpha == -2:
        return np.cumsum(rng.standard_normal(count))
    size = _LONGER * count
    frequency = np.fft.rfftfreq(size)[1:]
    response = np.abs(2.0 * np.sin(np.pi * frequency)) ** (alpha / 2.0)
    coefficients = response * (
        rng.standard_normal(frequency.size) + 1j * rng.standard_normal(frequency.size)
    )
    return np.fft.irfft(np.concatenate(([0.0], coefficients)), size)[:count] * np.sqrt(size / 2.0)


def expected_allan_variance(alpha, m):
    """Allan variance of `power_law` at the averaging factor m, from the spectrum alone.

    σ² = 2 ∫ S_y sin⁴(π m f) / (m sin(π f))² df over 0 to 1/2: the transfer function of differences
    of sums of m samples. The integral is a sum over midpoints on a grid that is fine near zero.
    """
    edges = np.concatenate(
        ([0.0], np.geomspace(1e-9, 1e-3, 20_001), np.linspace(1e-3, 0.5, 400_001)[1:])
    )
    f = (edges[1:] + edges[:-1]) / 2.0
    density = 2.0 * np.abs(2.0 * np.sin(np.pi * f)) ** alpha
    transfer = 2.0 * np.sin(np.pi * m * f) ** 4 / (m * np.sin(np.pi * f)) ** 2
    return float(np.sum(density * transfer * np.diff(edges)))
