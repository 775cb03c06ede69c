"""Bias of deviations of records that are seen a quarter of the time (aim: below 2 %).

Each drawn record is evaluated complete and with gaps; the root of the ratio of the mean variances
is printed for every power law and averaging factor, once for blocks of 64 samples in 256 and once
for samples missing at random; beside it what closing up the gaps would give.
"""

from __future__ import annotations

import sys

import numpy as np

sys.path.insert(0, "tests")

from clockgeo.frequency import TickSeries
from clockgeo.frequency.deviations import stability_curve
from frequency.power_laws import LAWS, power_law

SAMPLES = 8_192
FACTORS = [1.0, 4.0, 16.0, 64.0, 256.0, 1024.0]


def patterns(rng: np.random.Generator) -> dict[str, np.ndarray]:
    """Which samples are seen, by name of the pattern."""
    place = np.arange(SAMPLES)
    return {"blocks": place % 256 < 64, "random": rng.random(SAMPLES) < 0.25}


def variances(tick: np.ndarray, y: np.ndarray, statistic: str, tau: list[float]) -> np.ndarray:
    """Squared deviations at the averaging times."""
    series = TickSeries(tick.astype(np.int64), y)
    return stability_curve(series, statistic, interval=1.0, tau=tau).deviation ** 2


def main() -> None:
    """Print the table for one statistic, or for three."""
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    statistics = sys.argv[2:] or ["overlapping-allan", "modified-allan", "overlapping-hadamard"]
    rng = np.random.default_rng(20270301)
    for statistic in statistics:
        print(f"\n{statistic}, {runs} records of {SAMPLES} samples; tau = {FACTORS}")
        for alpha, law in LAWS.items():
            sums: dict[str, np.ndarray] = {}
            whole = np.zeros(len(FACTORS))
            for _ in range(runs):
                y = power_law(alpha, SAMPLES, rng)
                whole += variances(np.arange(SAMPLES), y, statistic, FACTORS)
                for name, seen in patterns(rng).items():
                    tick = np.flatnonzero(seen)
                    sums[name] = sums.get(name, 0.0) + variances(tick, y[tick], statistic, FACTORS)
                    closed = variances(np.arange(tick.size), y[tick], statistic, FACTORS[:4])
                    sums["closed " + name] = sums.get("closed " + name, 0.0) + closed
            for name, total in sums.items():
                ratio = np.sqrt(total / whole[: total.size])
                print(f"{law:15s} {name:14s}", " ".join(f"{one:7.3f}" for one in ratio))


if __name__ == "__main__":
    main()
