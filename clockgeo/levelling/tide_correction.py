"""The tide of two sites as a correction to their frequency ratio, epoch by epoch."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

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
    tai_ns : int64 array, shape (N,) or None
        Epochs; None where there is no correction.
    tide : TideInterpolator or None
        Potential of the numerator's site minus the denominator's.
    """

    at_epochs: NDArray[np.float64]
    tai_ns: NDArray[np.int64] | None = None
    tide: TideInterpolator | None = None

    @classmethod
    def none(cls, size: int) -> TideCorrection:
        """No correction for `size` epochs, exact."""
        return cls(np.zeros(size))

    @property
    def mean(self) -> float:
        """Mean over the epochs, fractional; 0 without epochs."""
        return float(np.mean(self.at_epochs)) if self.at_epochs.size else 0.0

    @cached_property
    def u(self) -> float:
        """Standard uncertainty of the mean correction, fractional; 0 without a correction."""
        if self.tide is None or self.tai_ns is None or not self.tai_ns.size:
            return 0.0
        return shift_from_potential(self.tide.mean(self.tai_ns).u)

    def at(self, chosen: NDArray[np.bool_]) -> TideCorrection:
        """Correction at some of the epochs."""
        epochs = None if self.tai_ns is None else self.tai_ns[chosen]
        return TideCorrection(self.at_epochs[chosen], epochs, self.tide)


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
    return TideCorrection(shift_from_potential(tide(tai_ns)), tai_ns, tide)
