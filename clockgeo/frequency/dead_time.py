"""Dead time: what is added when a mean over part of the time stands for the whole."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.noise import NoiseModel

__all__ = ["dead_time_variance", "uptime_windows"]


def dead_time_variance(
    model: NoiseModel, windows: Sequence[tuple[float, float]], total: float
) -> float:
    """Variance of the mean of a flywheel over its uptime as its mean over a whole interval.

    Parameters
    ----------
    model : NoiseModel
        Noise of the flywheel, the oscillator that runs through while the clock is down. White,
        flicker and random-walk FM count; phase noise averages down faster than any of them.
    windows : sequence of (float, float)
        Start and stop of each stretch of uptime in s, from the start of the whole interval.
    total : float
        Length of the whole interval in s.

    Returns
    -------
    float
        Variance of the fractional frequency; a deterministic drift of the flywheel, and its u, must
        be taken off before (`drift` of the model is not part of the variance).

    Raises
    ------
    DataError
        If the interval or a window is empty, windows overlap, or one reaches beyond the interval.

    Notes
    -----
    u² = ∫ S_y |G|² df for g(t) = 1/T - 1_U(t)/T_u, evaluated as a contrast of windows with the
    second antiderivative of the generalised covariance; the white part is (h0/2)(1/T_u - 1/T).
    NIST Technical Note 1337, distributed dead time; the exact windows instead of bias functions.

    Examples
    --------
    >>> white = NoiseModel(white_fm=(1 / 2) ** 0.5)  # h0 = 1
    >>> round(dead_time_variance(white, [(0.0, 1.5), (4.0, 5.5)], 10.0), 7)
    0.1166667
    """
    up = _checked(windows, total)
    lengths = up[:, 1] - up[:, 0]
    uptime = float(lengths.sum())
    white = model.h0 / 2.0 * (1.0 / uptime - 1.0 / total)
    # The contrast: the whole interval with weight 1, the windows with -length/uptime.
    starts = np.concatenate(([0.0], up[:, 0]))
    stops = np.concatenate(([total], up[:, 1]))
    weights = np.concatenate(([1.0], -lengths / uptime))
    scaled = weights / (stops - starts)
    slow = scaled @ _overlap_integrals(model, starts, stops, total) @ scaled
    return max(white, 0.0) + max(float(slow), 0.0)


def _overlap_integrals(
    model: NoiseModel, starts: NDArray[np.float64], stops: NDArray[np.float64], scale: float
) -> NDArray[np.float64]:
    """∫∫ K(t - s) over each pair of windows, K the generalised covariance of the slow laws."""

    def second(t: NDArray[np.float64]) -> NDArray[np.float64]:
        size = np.abs(t)
        log = np.log(np.maximum(size, 1e-300) / scale)
        flicker = -model.h_minus1 * (size**2 / 2.0 * log - 0.75 * size**2)
        walk = -model.h_minus2 * np.pi**2 * size**3 / 6.0
        return np.asarray(flicker + walk)

    a, b = starts[:, None], stops[:, None]
    c, d = starts[None, :], stops[None, :]
    return second(b - c) + second(a - d) - second(a - c) - second(b - d)


def _checked(windows: Sequence[tuple[float, float]], total: float) -> NDArray[np.float64]:
    if not total > 0.0:
        raise DataError("the interval is empty", value=f"{total} s")
    up = np.array(sorted(windows), dtype=np.float64).reshape(-1, 2)
    if not up.size or np.any(up[:, 1] <= up[:, 0]):
        raise DataError(
            "a window of uptime is empty", value=[tuple(one) for one in up.tolist()] or "no window"
        )
    if np.any(up[1:, 0] < up[:-1, 1]):
        raise DataError("windows of uptime overlap", advice="Join them")
    if up[0, 0] < 0.0 or up[-1, 1] > total * (1.0 + 1e-12):
        raise DataError(
            "uptime reaches beyond the interval",
            value=f"{up[0, 0]} s to {up[-1, 1]} s",
            allowed=f"0 s to {total} s",
        )
    return up


def uptime_windows(
    tick: NDArray[np.int64], interval: float, *, bridge: int = 1
) -> list[tuple[float, float]]:
    """Stretches of uptime of a record, in s from its first tick.

    Parameters
    ----------
    tick : int64 array, shape (N,)
        Places of the valid samples, increasing.
    interval : float
        Length of a tick in s.
    bridge : int
        Steps between neighbours up to which they count as one stretch.
    """
    places = tick - tick[0]
    edges = np.flatnonzero(np.diff(places) > bridge) + 1
    first = places[np.concatenate(([0], edges))]
    last = places[np.concatenate((edges - 1, [places.size - 1]))] + 1
    return [(float(a * interval), float(b * interval)) for a, b in zip(first, last, strict=True)]
