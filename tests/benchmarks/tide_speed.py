"""Tide of a pair of sites over 30 days at 1 s, against one cubic-spline evaluation. Prints figures.

Aim: at most 10 times scipy's CubicSpline at the same epochs; error below 1e-21.
"""

from __future__ import annotations

import time

import numpy as np
from scipy.interpolate import CubicSpline

from clockgeo.constants import SPEED_OF_LIGHT_SQUARED
from clockgeo.gravity import Place, SiteTide, TideInterpolator
from clockgeo.times import SECOND_NS, tai_from_iso

REPEATS = 5


def main() -> None:
    """Measure, compare and print."""
    start = tai_from_iso("2027-03-01T00:00:00Z")
    epochs = start + np.arange(30 * 86_400, dtype=np.int64) * SECOND_NS
    pair = SiteTide(Place(52.3, 10.5, 130.0)), SiteTide(Place(35.7, 139.6, 90.0))

    def tide() -> np.ndarray:
        return TideInterpolator(int(epochs[0]), int(epochs[-1]), *pair)(epochs)

    nodes = np.arange(0.0, 30 * 86_400 + 1200, 1200.0)
    spline = CubicSpline(nodes, np.sin(nodes / 7000.0))
    seconds = (epochs - start) / SECOND_NS

    tide_time = min(_seconds(tide) for _ in range(REPEATS))
    spline_time = min(_seconds(lambda: spline(seconds)) for _ in range(REPEATS))
    sample = epochs[:: epochs.size // 20_000]
    fast = TideInterpolator(int(epochs[0]), int(epochs[-1]), *pair)
    error = np.max(np.abs(fast(sample) - fast.exactly(sample))) / SPEED_OF_LIGHT_SQUARED.value
    print(f"tide of a pair, {epochs.size} epochs: {tide_time:.3f} s")
    print(f"one cubic-spline evaluation:         {spline_time:.3f} s")
    print(f"ratio {tide_time / spline_time:.1f} (aim: at most 10)")
    print(f"largest error {error:.1e} (aim: below 1e-21)")


def _seconds(work) -> float:
    begin = time.perf_counter()
    work()
    return time.perf_counter() - begin


if __name__ == "__main__":
    main()
