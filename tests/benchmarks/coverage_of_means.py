"""How often the interval of local - remote - local holds the truth when the noise is not known.

    python tests/benchmarks/coverage_of_means.py [RUNS]

Fifteen days of one pair of clocks, five local, five remote, five local; noise of four kinds; uptime
20, 50 and 90 % in runs of three hours. Noise is fitted to the three sessions, as `level` does; the
table holds the coverage of 68.3 % and 95 % intervals and the width against known noise.
"""

from __future__ import annotations

import sys

import numpy as np
from scipy import stats

from clockgeo.frequency import NoiseModel, TickSeries, draw_noise, fit_noise, mean_covariance

INTERVAL = 1800.0
PER_DAY = int(86_400 / INTERVAL)
LAWS = {
    "white": NoiseModel(white_fm=1e-15),
    "flicker": NoiseModel(flicker_fm=1e-17),
    "white + flicker": NoiseModel(white_fm=1e-15, flicker_fm=5e-18),
    "random walk": NoiseModel(random_walk_fm=2e-20),
}
DESIGN = np.array([[1.0, 0.0], [1.0, 1.0], [1.0, 0.0]])


def drawn_mask(count: int, uptime: float, rng: np.random.Generator) -> np.ndarray:
    """Runs of valid samples and gaps, exponential in length."""
    mask, place, valid = np.zeros(count, dtype=bool), 0, bool(rng.random() < uptime)
    mean_run = 10_800.0 / INTERVAL
    while place < count:
        mean = mean_run if valid else mean_run * (1.0 - uptime) / uptime
        length = 1 + int(rng.exponential(mean))
        mask[place : place + length] = valid
        place, valid = place + length, not valid
    return mask


def contrast(model: NoiseModel, series: list[TickSeries]) -> tuple[float, float]:
    """Remote minus local and its u, as generalised least squares gives it."""
    weight = np.linalg.inv(mean_covariance(model, series, interval=INTERVAL))
    cofactor = np.linalg.inv(DESIGN.T @ weight @ DESIGN)
    means = np.array([one.y.mean() for one in series])
    return float((cofactor @ DESIGN.T @ weight @ means)[1]), float(np.sqrt(cofactor[1, 1]))


def run(runs: int) -> None:
    print(
        f"{runs} runs a cell; two standard deviations of a share: 68.3 % +- "
        f"{200 * np.sqrt(0.683 * 0.317 / runs):.1f}, 95 % +- {200 * np.sqrt(0.0475 / runs):.1f}"
    )
    for name, model in LAWS.items():
        for uptime in (0.2, 0.5, 0.9):
            rng = np.random.default_rng(20270)
            rows = []
            for _ in range(runs):
                count = 15 * PER_DAY
                # The middle of a longer draw, so that slow noise has a past.
                y = draw_noise(model, 3 * count, INTERVAL, rng)[count : 2 * count]
                mask = drawn_mask(count, uptime, rng)
                places = [np.arange(5 * k * PER_DAY, 5 * (k + 1) * PER_DAY) for k in range(3)]
                series = [TickSeries(p[mask[p]], y[p[mask[p]]]) for p in places]
                fit = fit_noise(series, interval=INTERVAL, means=[0, 1, 0])
                value, u = contrast(fit.averaged, series)
                rows.append((value, u, fit.degrees_of_freedom, contrast(model, series)[1]))
            value, u, freedom, known = np.array(rows).T
            held = [
                100 * np.mean(np.abs(value) < stats.t.ppf(0.5 + share / 2, freedom) * u)
                for share in (0.683, 0.95)
            ]
            width = np.median(stats.t.ppf(0.975, freedom) * u / (1.96 * known))
            print(
                f"{name:16} uptime {100 * uptime:.0f} %: 68.3 % holds {held[0]:.1f}, "
                f"95 % holds {held[1]:.1f}, 95 % width against known noise {width:.2f}",
                flush=True,
            )


if __name__ == "__main__":
    run(int(sys.argv[1]) if len(sys.argv) > 1 else 500)
