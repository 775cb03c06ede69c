"""Speed of deviations against passes over memory and against plain NumPy, in one run.

Aims: overlapping Allan, all octaves, 10^7 samples with 10 % gaps: at most 5 passes of
numpy.dot(x, x) a tau and at least 8 times as fast as plain NumPy; modified Allan at most 3 times
that; 10^8 samples in at most 3 GB (argument "memory").
"""

from __future__ import annotations

import os
import resource
import sys
import time
from collections.abc import Callable

os.environ["OPENBLAS_NUM_THREADS"] = "1"  # threads that wait for a busy machine count as work

import numpy as np

from clockgeo.frequency import TickSeries
from clockgeo.frequency.deviations import stability_curve

SAMPLES = 10_000_000


def shortest(work: Callable[[], object], repeats: int) -> float:
    """Shortest of several times of the processors (all threads), s: other work does not count."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


def with_gaps(samples: int, rng: np.random.Generator) -> TickSeries:
    """White noise with 10 % missing in stretches of 1 to 200 samples."""
    y = rng.standard_normal(samples)
    seen = np.ones(samples, dtype=bool)
    missing = 0
    while missing < samples // 10:
        starts = rng.integers(0, samples, 2_000)
        for start, length in zip(starts, rng.integers(1, 201, 2_000), strict=True):
            seen[start : start + length] = False
        missing = samples - int(np.count_nonzero(seen))
    tick = np.flatnonzero(seen)
    return TickSeries(tick, y[tick])


def plain_numpy(series: TickSeries) -> list[float]:
    """Overlapping Allan deviation of complete windows at all octaves, as a textbook writes it."""
    size = int(series.tick[-1]) + 1
    y = np.full(size, np.nan)
    y[series.tick] = series.y
    found = []
    m = 1
    while 4 * m <= size:
        valid = ~np.isnan(y)
        total = np.concatenate(([0.0], np.cumsum(np.where(valid, y, 0.0))))
        count = np.concatenate(([0], np.cumsum(valid)))
        averages = (total[m:] - total[:-m]) / m
        averages[count[m:] - count[:-m] < m] = np.nan
        found.append(float(np.sqrt(np.nanmean((averages[m:] - averages[:-m]) ** 2) / 2.0)))
        if not np.any(count[2 * m * 2 :] - count[: -2 * m * 2] == 4 * m):
            break
        m *= 2
    return found


def main() -> None:
    """Print the ratios, or the memory of 10^8 samples."""
    rng = np.random.default_rng(20270301)
    if sys.argv[1:] == ["memory"]:
        series = TickSeries(np.arange(10**8), rng.standard_normal(10**8))
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        stability_curve(series, interval=1.0)
        after = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        print(f"10^8 samples: {after / 2**20:.2f} GB with the record's own {before / 2**20:.2f} GB")
        return
    series = with_gaps(SAMPLES, rng)
    print(f"{SAMPLES} ticks, {100 - 100 * series.y.size / SAMPLES:.1f} % missing")
    x = rng.standard_normal(SAMPLES)
    one_pass = shortest(lambda: np.dot(x, x), 9)
    print(f"one pass of numpy.dot: {1e3 * one_pass:.2f} ms")
    stability_curve(TickSeries(series.tick[:5000], series.y[:5000]), interval=1.0)
    times = {}
    for statistic in ("overlapping-allan", "modified-allan"):
        octaves = stability_curve(series, statistic, interval=1.0).tau.size
        each = shortest(lambda: stability_curve(series, statistic, interval=1.0), 3)  # noqa: B023
        times[statistic] = each
        print(
            f"{statistic}: {each:.3f} s for {octaves} octaves, {1e3 * each / octaves:.1f} ms or "
            f"{each / octaves / one_pass:.2f} passes a tau"
        )
    start = time.process_time()
    octaves = len(plain_numpy(series))
    plain = (time.process_time() - start) / octaves
    ours = times["overlapping-allan"] / stability_curve(series, interval=1.0).tau.size
    print(f"plain NumPy: {1e3 * plain:.1f} ms a tau, {plain / ours:.1f} times as long (aim >= 8)")
    ratio = times["modified-allan"] / times["overlapping-allan"]
    print(f"modified over overlapping Allan: {ratio:.2f} (aim <= 3)")


if __name__ == "__main__":
    main()
