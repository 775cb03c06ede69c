"""How often the stated intervals of a height difference hold the truth, by simulation.

    python tests/benchmarks/coverage_of_levelling.py [RUNS] [CAMPAIGN]

Draws campaigns of the example's kind, levels each, and counts. Prints the shares with their
binomial two-sigma limits, and the scatter of the results against the stated u.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
from scipy import stats

from clockgeo.campaign import level_measured, measure_record, read_document
from clockgeo.planning import simulate_sessions

EXAMPLE = Path(__file__).parents[2] / "examples" / "saddle" / "campaign.toml"


def run(runs: int, path: Path) -> None:
    document = read_document(path)
    campaign = document.campaign.model_copy(update={"geoid": None})
    numbers = campaign.truth.geopotential_numbers
    results = []
    for seed in range(runs):
        drawn = simulate_sessions(campaign, np.random.default_rng(seed), tables=path.parent)
        measured = [
            measure_record(campaign, one.session, one.record(), folder=path.parent) for one in drawn
        ]
        result = level_measured(campaign, measured, folder=document.folder).result
        first = result.differences[0]
        truth = numbers[first.to_site] - numbers[first.from_site]
        scatter = result.scatter.standard_deviation if result.scatter else 0.0
        freedom = first.degrees_of_freedom or 1e9
        results.append((first.geopotential_difference - truth, first.u, freedom, scatter))
    error, u, freedom, scatter = np.array(results).T
    print(f"{runs} campaigns: {document.campaign.head.name}, {first.from_site} to {first.to_site}")
    for share in (0.68, 0.95):
        k = stats.t.ppf(0.5 + share / 2, freedom)
        held = float(np.mean(np.abs(error) <= k * u))
        spread = 2 * np.sqrt(share * (1 - share) / runs)
        low, high = 100 * (share - spread), 100 * (share + spread)
        print(f"{100 * share:.0f} % interval holds the truth in {100 * held:.1f} %", end=" ")
        print(f"(expected {low:.1f} to {high:.1f} %)")
    bias, u_bias = np.mean(error), np.std(error) / np.sqrt(runs)
    print(f"scatter {np.std(error):.4f}, bias {bias:.4f} +- {u_bias:.4f},", end=" ")
    print(f"median stated u {np.median(u):.4f} m2 s-2")
    print(f"excess scatter found in {100 * np.mean(scatter > 0):.0f} % of the campaigns")


if __name__ == "__main__":
    run(
        int(sys.argv[1]) if len(sys.argv) > 1 else 300,
        Path(sys.argv[2]) if len(sys.argv) > 2 else EXAMPLE,
    )
