"""Everything that varies at a site, evaluated fast at millions of epochs, and its mean with u."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline

from clockgeo.constants import Constant
from clockgeo.errors import DataError
from clockgeo.gravity.loading import LoadTable
from clockgeo.gravity.places import Place
from clockgeo.gravity.polar_motion import PoleCoordinates, pole_tide
from clockgeo.gravity.tides import SkyPositions, sky_positions, tidal_potential_from
from clockgeo.times import SECOND_NS, iso_utc

__all__ = ["NEGLECTED", "UNMODELLED_FRACTION", "SiteTide", "TideInterpolator", "TideMean"]

UNMODELLED_FRACTION = Constant(
    "u(tide)/tide",
    0.04,
    "1",
    0.0,
    "Love numbers, core resonance near K1 and ocean loading of unknown phase (common practice, no "
    "source)",
)
NEGLECTED = (
    "core resonance of the Love numbers near K1",
    "latitude dependence of the Love numbers",
    "ocean loading (unless a table is given)",
    "pole tide (unless pole coordinates are given)",
    "air pressure, ground water",
)
"""What the tide of a site leaves out; `UNMODELLED_FRACTION` stands for the first three."""

_NODE_STEP_NS = 1200 * SECOND_NS
_MARGIN = 4  # nodes beyond both ends, where the spline's end condition still shows
_PHASES = 8
_LARGEST_SAMPLE = 4096


@dataclass(frozen=True)
class SiteTide:
    """All variable potentials at one place.

    Attributes
    ----------
    place : Place
    pole : PoleCoordinates or None
        Adds the pole tide.
    load : LoadTable or None
        Adds ocean or other loading.
    """

    place: Place
    pole: PoleCoordinates | None = None
    load: LoadTable | None = None

    def potential(
        self, tai_ns: ArrayLike, *, sky: SkyPositions | None = None
    ) -> NDArray[np.float64]:
        """Time-variable potential a clock on the crust feels, every epoch evaluated.

        Parameters
        ----------
        tai_ns : int64 array, shape (N,)
            Epochs in TAI nanoseconds since 1958.
        sky : SkyPositions, optional
            Positions at the same epochs, to share them between places.

        Returns
        -------
        array, shape (N,)
            m² s⁻², permanent tide taken off; positive W lowers the geopotential number.
        """
        epochs = np.atleast_1d(np.asarray(tai_ns, dtype=np.int64))
        positions = sky_positions(epochs) if sky is None else sky
        return _sum(self, epochs, positions, epochs)


@dataclass(frozen=True)
class TideMean:
    """Mean of the variable potential over the valid epochs of a session.

    Attributes
    ----------
    potential, u : float
        Mean of W and its standard uncertainty, m² s⁻².
    interpolation_error : float
        Largest error of the interpolation found at the middle between nodes, m² s⁻².
    neglected : tuple of str
        What was left out.
    """

    potential: float
    u: float
    interpolation_error: float
    neglected: tuple[str, ...] = NEGLECTED


class TideInterpolator:
    """The variable potential of a site, or of one site minus another, at any epoch of a span.

    Parameters
    ----------
    start, stop : int
        Span in TAI nanoseconds since 1958, both ends included.
    site : SiteTide
    other : SiteTide, optional
        Subtracted from `site`.

    Raises
    ------
    DataError
        If the span is empty.

    Notes
    -----
    A cubic spline through nodes every 1200 s. The fourth derivative of a wave of 12.4 h and
    6 m² s⁻² bounds the error by 1.3e-5 m² s⁻² (1.5e-22); `largest_error` measures it.
    """

    def __init__(
        self, start: int, stop: int, site: SiteTide, other: SiteTide | None = None
    ) -> None:
        if stop < start:
            raise DataError(
                "the tide's span ends before it starts",
                value=f"{iso_utc(start)} to {iso_utc(stop)}",
            )
        self.start, self.stop = int(start), int(stop)
        self.site, self.other = site, other
        last = -(-(self.stop - self.start) // _NODE_STEP_NS) + _MARGIN
        numbers = np.arange(-_MARGIN, last + 1)
        nodes = self.start + numbers * _NODE_STEP_NS
        self._spline = CubicSpline(numbers.astype(np.float64), self._at_nodes(nodes))

    def __call__(self, tai_ns: ArrayLike) -> NDArray[np.float64]:
        """Potential in m² s⁻² at epochs within the span.

        Raises
        ------
        DataError
            If an epoch lies outside the span.
        """
        epochs = np.asarray(tai_ns, dtype=np.int64)
        if epochs.size and (int(epochs.min()) < self.start or int(epochs.max()) > self.stop):
            raise DataError(
                "an epoch lies outside the tide's span",
                value=iso_utc(int(epochs.min() if epochs.min() < self.start else epochs.max())),
                allowed=f"{iso_utc(self.start)} to {iso_utc(self.stop)}",
            )
        return self._interpolated(epochs)

    def exactly(self, tai_ns: ArrayLike) -> NDArray[np.float64]:
        """Potential in m² s⁻² with every epoch evaluated: slow, the measure of the fast way."""
        epochs = np.atleast_1d(np.asarray(tai_ns, dtype=np.int64))
        sky = sky_positions(epochs)
        total = self.site.potential(epochs, sky=sky)
        return total if self.other is None else total - self.other.potential(epochs, sky=sky)

    def largest_error(self, *, samples: int = 64) -> float:
        """Largest interpolation error in m² s⁻², sampled half-way between nodes over the span."""
        steps = max((self.stop - self.start) // _NODE_STEP_NS, 1)
        chosen = np.unique(np.linspace(0, steps - 1, samples).astype(np.int64))
        middles = np.minimum(self.start + (2 * chosen + 1) * (_NODE_STEP_NS // 2), self.stop)
        return float(np.max(np.abs(self._interpolated(middles) - self.exactly(middles))))

    def mean(self, tai_ns: ArrayLike) -> TideMean:
        """Mean over the valid epochs and its u.

        Parameters
        ----------
        tai_ns : int64 array, shape (N,)
            The epochs that enter the mean of the record, N >= 1.

        Raises
        ------
        DataError
            If there is no epoch, or one lies outside the span.

        Notes
        -----
        What the model leaves out is a few per cent of each wave, with a phase that is not known.
        u is `UNMODELLED_FRACTION` times the largest mean that the same epochs would have seen with
        the tide shifted by up to half a day: 0.04 of the amplitude for an hour, little for whole
        days. The u of the loading tables is added in full.
        """
        epochs = np.asarray(tai_ns, dtype=np.int64)
        if not epochs.size:
            raise DataError("a mean of the tide needs at least one valid epoch")
        values = self(epochs)
        error = self.largest_error()
        u = np.hypot(UNMODELLED_FRACTION.value * self._largest_shifted_mean(epochs), error)
        for site in (self.site, self.other):
            if site is not None and site.load is not None:
                u = np.hypot(u, site.load.u)
        return TideMean(float(np.mean(values)), float(u), error)

    def _interpolated(self, epochs: NDArray[np.int64]) -> NDArray[np.float64]:
        return np.asarray(self._spline((epochs - self.start) / _NODE_STEP_NS))

    def _at_nodes(self, nodes: NDArray[np.int64]) -> NDArray[np.float64]:
        """Node values; beyond the ends the slow pole tide is held: its table may stop there."""
        sky, inside = sky_positions(nodes), np.clip(nodes, self.start, self.stop)
        total = _sum(self.site, nodes, sky, inside)
        return total if self.other is None else total - _sum(self.other, nodes, sky, inside)

    def _largest_shifted_mean(self, epochs: NDArray[np.int64]) -> float:
        stride = -(-epochs.size // _LARGEST_SAMPLE)
        sample = epochs[::stride]
        first, last = int(sample.min()), int(sample.max())
        place = SiteTide(self.site.place)
        other = None if self.other is None else SiteTide(self.other.place)
        half_day = 43_200 * SECOND_NS
        wide = TideInterpolator(first - half_day, last + half_day, place, other)
        shifts = (np.arange(_PHASES + 1) - _PHASES // 2) * (2 * half_day // _PHASES)
        return max(abs(float(np.mean(wide(sample + shift)))) for shift in shifts)


def _sum(
    site: SiteTide,
    epochs: NDArray[np.int64],
    sky: SkyPositions,
    pole_epochs: NDArray[np.int64],
) -> NDArray[np.float64]:
    total = tidal_potential_from(sky, site.place).variable
    if site.pole is not None:
        total = total + pole_tide(pole_epochs, site.place, site.pole)
    if site.load is not None:
        total = total + site.load.potential(epochs)
    return total
