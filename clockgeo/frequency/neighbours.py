"""How neighbouring rows hang together: autocorrelation with gaps, and what it gives away."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Interpolation",
    "Neighbours",
    "correlation_of_neighbours",
    "interpolated_cycle",
    "interpolation_correlation",
]

_FEWEST_LAGS, _LAGS = 10, 60
_MOST_TICKS = 1 << 21
_LINE_TICKS = 1 << 17
_FEWEST_ROWS = 500
_FIT_LAGS = 8
_LARGEST_MISFIT = 0.06
"""Largest distance of any correlation from that of interpolated rows; the phase of the knots
moves it by 0.05."""
_LINE_POWER = 25.0
"""Power of a line over its surroundings that chance reaches once in 10^6 records."""


@dataclass(frozen=True, eq=False)
class Neighbours:
    """Correlation of rows with their neighbours.

    Attributes
    ----------
    correlation : float64 array, shape (L + 1,)
        At lags of 0 to L ticks; 1 at lag 0. NaN where no two rows are that far apart.
    rows : int
        Rows it was estimated from.
    """

    correlation: NDArray[np.float64]
    rows: int

    @property
    def noise(self) -> float:
        """Standard deviation of a correlation that is zero."""
        return float(1.0 / np.sqrt(self.rows))

    @property
    def factor(self) -> float:
        """True u of a mean over the naive s/√N, by the correlations of short lags.

        The square is 1 + 2 Σ ρ_k over the L lags estimated (up to 60 ticks), good to a relative
        sqrt((4 L + 2)/rows); slower noise is not in it.
        """
        total = 1.0 + 2.0 * float(np.nansum(self.correlation[1:]))
        return float(np.sqrt(max(total, 0.0)))

    @property
    def correlated(self) -> bool:
        """Whether any of the first five lags is clearly not zero."""
        first = np.abs(self.correlation[1:6])
        return bool(np.any(first > max(5.0 * self.noise, 0.1)))

    @property
    def half_period(self) -> int | None:
        """Lag of the first deep minimum, ticks: half a period of an oscillation; None without."""
        rho = self.correlation
        below = np.flatnonzero(rho < -max(5.0 * self.noise, 0.1))
        if not below.size:
            return None
        first = int(below[0])
        above = np.flatnonzero(rho[first:] > 0.0)
        end = first + int(above[0]) if above.size else rho.size
        return first + int(np.argmin(rho[first:end]))


def correlation_of_neighbours(
    tick: NDArray[np.int64], values: NDArray[np.float64]
) -> Neighbours | None:
    """Estimate the autocorrelation of rows with gaps.

    Parameters
    ----------
    tick : int64 array, shape (N,)
        Time line, strictly increasing.
    values : float64 array, shape (N,)
        Deviations from the local level.

    Returns
    -------
    Neighbours or None
        Mean products over all pairs of rows at each lag, divided by the mean square; None for
        fewer than 500 rows. One lag for 50 rows, 10 to 60; of long records, 2^21 ticks are used.
    """
    if values.size < _FEWEST_ROWS:
        return None
    grid, valid = _densest(tick, values, _MOST_TICKS)
    rows = int(np.count_nonzero(valid))
    weight = valid.astype(np.float64)
    lags = min(max(_FEWEST_LAGS, rows // 50), _LAGS, grid.size - 1)
    products = np.full(lags + 1, np.nan)
    for lag in range(lags + 1):
        pairs = float(weight[lag:] @ weight[: grid.size - lag])
        if pairs >= 30:
            products[lag] = float(grid[lag:] @ grid[: grid.size - lag]) / pairs
    if not products[0] > 0.0:
        return None
    return Neighbours(products / products[0], rows)


def _densest(
    tick: NDArray[np.int64], values: NDArray[np.float64], most: int
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Values on their grid, 0 in gaps, and where they are: the fullest stretch of `most` ticks."""
    first = np.searchsorted(tick, tick - most, side="right")
    last = int(np.argmax(np.arange(tick.size) - first))
    chosen = slice(int(first[last]), last + 1)
    places = tick[chosen] - tick[chosen][0]
    grid = np.zeros(int(places[-1]) + 1)
    valid = np.zeros(grid.size, dtype=bool)
    grid[places] = values[chosen]
    valid[places] = True
    return grid, valid


def interpolation_correlation(lag: NDArray[np.float64], cycle: float) -> NDArray[np.float64]:
    """Correlation of rows interpolated linearly between independent values `cycle` ticks apart.

    With h = |lag|/cycle it is 1 − 3h²/2 + 3h³/4 for h < 1, (2 − h)³/4 for h < 2, and 0 beyond:
    the triangle of linear interpolation convolved with itself, averaged over the phase of the
    rows between the knots.
    """
    h = np.abs(lag) / cycle
    inner = 1.0 - 1.5 * h**2 + 0.75 * h**3
    return np.where(h < 1.0, inner, np.clip(2.0 - h, 0.0, None) ** 3 / 4.0)


@dataclass(frozen=True)
class Interpolation:
    """Rows that are interpolated between values of a slower cycle.

    Attributes
    ----------
    cycle : float
        Cycle of the independent values, ticks.
    """

    cycle: float

    @property
    def factor(self) -> float:
        """True u of a mean over the naive s/√N: sqrt(1.5 cycle), for interpolation lowers s too."""
        return float(np.sqrt(1.5 * self.cycle))


def interpolated_cycle(
    tick: NDArray[np.int64], values: NDArray[np.float64], neighbours: Neighbours
) -> Interpolation | None:
    """Recognise rows that were interpolated from a slower clock cycle.

    Parameters
    ----------
    tick, values : arrays, shape (N,)
        As for `correlation_of_neighbours`.
    neighbours : Neighbours
        Its result.

    Returns
    -------
    Interpolation or None
        None unless two independent signs agree: the correlations are those of interpolated rows,
        and the variance of the rows pulsates with the cycle, for it is lowest midway between two
        knots: (1 − φ)² + φ². A servo or a filter makes similar correlations, but no such pulsation.
    """
    lags = np.arange(1.0, min(_FIT_LAGS, neighbours.correlation.size - 1) + 1.0)
    found = neighbours.correlation[1 : lags.size + 1]
    cycles = np.arange(1.05, 3.5, 0.005)
    models = np.array([interpolation_correlation(lags, cycle) for cycle in cycles])
    misfits = np.nanmax(np.abs(models - found), axis=1)
    best = int(np.argmin(misfits))
    if not misfits[best] < _LARGEST_MISFIT + 5.0 * neighbours.noise:
        return None
    frequency, power = _strongest_pulsation(tick, values, 1.0 / cycles[best])
    if power < _LINE_POWER:
        return None
    return Interpolation(float(1.0 / frequency))


def _strongest_pulsation(
    tick: NDArray[np.int64], values: NDArray[np.float64], expected: float
) -> tuple[float, float]:
    """Frequency, per tick, of the strongest line of the squares near `expected`, and its power.

    The frequency lies between a half and one per tick for cycles below two ticks and is seen
    folded at half the sampling rate; it is unfolded to the side of `expected`.
    """
    grid, valid = _densest(tick, values, _LINE_TICKS)
    squares = np.where(valid, grid**2, 0.0)
    # A few large values must not carry the spectrum.
    squares = np.minimum(squares, 12.0 * float(np.mean(squares[valid])))
    squares -= np.where(valid, np.mean(squares[valid]), 0.0)
    spectrum = np.abs(np.fft.rfft(squares)) ** 2
    frequencies = np.fft.rfftfreq(grid.size)
    folded = expected if expected <= 0.5 else 1.0 - expected
    near = np.flatnonzero((np.abs(frequencies - folded) < 0.05) & (frequencies > 0.02))
    if near.size < 20:
        return expected, 0.0
    background = float(np.median(spectrum[near])) / np.log(2.0)
    top = near[int(np.argmax(spectrum[near]))]
    power = float(spectrum[top]) / background if background > 0.0 else 0.0
    return (frequencies[top] if expected <= 0.5 else 1.0 - frequencies[top]), power
