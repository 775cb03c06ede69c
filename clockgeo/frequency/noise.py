"""Power-law noise of a clock or link: what a user states, and what a fit finds."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.tables import NonNegative, Table

__all__ = ["NoiseModel"]

_LEVELS = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm")
_TWO_LN2 = 2.0 * np.log(2.0)
_FLICKER_PHASE = 2.6


class NoiseModel(Table):
    """Levels of the five power laws as Allan deviations at 1 s, or as the floor, and a drift.

    One-sided S_y(f) = Σ h_a f^a; IEEE Std 1139. The two phase noises are given for the bandwidth
    1/(2 τ0) of samples taken every τ0 = 1 s.
    """

    white_pm: NonNegative = 0.0
    """Allan deviation of white phase noise at 1 s; falls as 1/τ."""
    flicker_pm: NonNegative = 0.0
    """Allan deviation of flicker phase noise at 1 s; falls nearly as 1/τ."""
    white_fm: NonNegative = 0.0
    """Allan deviation of white frequency noise at 1 s; falls as 1/√τ."""
    flicker_fm: NonNegative = 0.0
    """Floor of flicker frequency noise."""
    random_walk_fm: NonNegative = 0.0
    """Allan deviation of random-walk frequency noise at 1 s; grows as √τ."""
    drift: float = 0.0
    """Linear drift of y in 1/s."""

    @property
    def h0(self) -> float:
        """White FM level: σ² = h0/(2τ)."""
        return 2.0 * self.white_fm**2

    @property
    def h_minus1(self) -> float:
        """Flicker FM level: σ² = 2 ln 2 h-1."""
        return float(self.flicker_fm**2 / _TWO_LN2)

    @property
    def h_minus2(self) -> float:
        """Random-walk FM level: σ² = (2π²/3) τ h-2."""
        return float(self.random_walk_fm**2 * 3.0 / (2.0 * np.pi**2))

    def allan_variance(self, tau: ArrayLike) -> NDArray[np.float64]:
        """Allan variance at averaging times `tau` in s; drift included.

        Flicker phase noise falls more slowly than 1/τ² by a logarithm, (3 ln τ)/2 + 2.60 over its
        value 8/3 at 1 s: from the structure function of phase sampled every second.
        """
        t = np.asarray(tau, dtype=np.float64)
        slowly = (1.5 * np.log(np.maximum(t, 1.0)) + _FLICKER_PHASE) / _FLICKER_PHASE
        phase = (self.white_pm**2 + self.flicker_pm**2 * slowly) / t**2
        frequency = self.white_fm**2 / t + self.flicker_fm**2 + self.random_walk_fm**2 * t
        return np.asarray(phase + frequency + self.drift**2 * t**2 / 2.0)

    def combined(self, *others: NoiseModel) -> NoiseModel:
        """Noise of a sum or difference of independent parts: variances add, drifts add."""
        parts = (self, *others)
        levels: dict[str, Any] = {
            name: float(np.sqrt(sum(getattr(part, name) ** 2 for part in parts)))
            for name in _LEVELS
        }
        return NoiseModel(**levels, drift=sum(part.drift for part in parts))
