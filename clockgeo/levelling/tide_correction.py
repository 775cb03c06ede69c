"""The tide of two sites as a correction to their frequency ratio, epoch by epoch."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.gravity.tide_model import SiteTide, TideInterpolator
from clockgeo.levelling.redshift import shift_from_potential

__all__ = ["TideCorrection", "tide_correction"]


@dataclass(frozen=True, eq=False)
class TideCorrection:
    """What is added to y at each epoch so that the time-variable tide is gone.

    Attributes
    ----------
    at_epochs : float array, shape (N,)
        To be added to y, fractional.
    u : float
        Standard uncertainty of the mean correction, fractional; 0 where there is no correction.
    tai_ns : int64 array, shape (N,) or None
        Epochs; None where there is no correction.
    tide : TideInterpolator or None
        Potential of the numerator's site minus the denominator's.
    """

    at_epochs: NDArray[np.float64]
    u: float
    tai_ns: NDArray[np.int64] | None = None
    tide: TideInterpolator | None = None

    @classmethod
    def none(cls, size: int) -> TideCorrection:
        """No correction for `size` epochs, exact."""
        return cls(np.zeros(size), 0.0)

    @property
    def mean(self) -> float:
        """Mean over the epochs, fractional; 0 without epochs."""
        return float(np.mean(self.at_epochs)) if self.at_epochs.size else 0.0

    def at(self, chosen: NDArray[np.bool_]) -> TideCorrection:
        """Correction at some of the epochs, with the u of their mean."""
        if self.tide is None or self.tai_ns is None or not np.any(chosen):
            return TideCorrection(self.at_epochs[chosen], 0.0)
        return _with_u(self.at_epochs[chosen], self.tai_ns[chosen], self.tide)


def tide_correction(
    tai_ns: NDArray[np.int64], *, numerator: SiteTide, denominator: SiteTide
) -> TideCorrection:
    """Correct a record for the time-variable tide of its two sites.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Valid epochs in TAI nanoseconds since 1958, N >= 1.
    numerator, denominator : SiteTide
        Where the two clocks stand.

    Returns
    -------
    TideCorrection

    Notes
    -----
    The tide W lowers C; y holds (C_n - C_d)/c², so W_n - W_d divided by c² is to be added. The
    permanent tide stays in y, whose mean is therefore mean-tide.
    """
    tide = TideInterpolator(int(tai_ns.min()), int(tai_ns.max()), numerator, denominator)
    return _with_u(shift_from_potential(tide(tai_ns)), tai_ns, tide)


def _with_u(
    at_epochs: NDArray[np.float64], tai_ns: NDArray[np.int64], tide: TideInterpolator
) -> TideCorrection:
    return TideCorrection(at_epochs, shift_from_potential(tide.mean(tai_ns).u), tai_ns, tide)
