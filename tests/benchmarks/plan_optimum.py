"""Cost of an optimal plan of 50 sites and 200 candidates, in evaluations of its covariance.

    python tests/benchmarks/plan_optimum.py

Prints, for every criterion, the certificate gap and the time of the optimisation over the time of
one evaluation of the plan's predicted covariance (the model of 200 sessions, built and solved as
for any plan: only the solution counts), in one run. Aim: a gap below 1e-6 in at most 500.
"""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np

from clockgeo.campaign.document import Document
from clockgeo.campaign.schema import Campaign
from clockgeo.planning import plan_model
from clockgeo.planning.allocation import allocation_problem
from clockgeo.planning.optimum import optimise
from clockgeo.planning.rounding import round_to_steps
from clockgeo.planning.schedule import placed_in_time

SITES, CANDIDATES, CLOCKS = 50, 200, 6


def document(criterion: str) -> Document:
    """Clocks that travel between random pairs of sites, all connected."""
    rng = np.random.default_rng(7)
    pairs = [(i, int(rng.integers(0, i))) for i in range(1, SITES)]
    while len(pairs) < CANDIDATES:
        i, j = rng.integers(0, SITES, 2).tolist()
        if i != j:
            pairs.append((i, j))
    candidates = []
    for number, (i, j) in enumerate(pairs):
        first, second = rng.choice(CLOCKS, 2, replace=False).tolist()
        candidates.append(
            {
                "id": f"candidate {number}",
                "numerator": {"clock": f"clock {first}", "site": f"site {i}"},
                "denominator": {"clock": f"clock {second}", "site": f"site {j}"},
                "uptime": float(rng.uniform(0.4, 0.9)),
            }
        )
    clocks = [
        {
            "id": f"clock {n}",
            "transition": "87Sr",
            "instability": {"white_fm": float(rng.uniform(2e-16, 9e-16)), "flicker_fm": 4e-19},
            "effect": [
                {"name": "constant", "u": 1e-18},
                {"name": "stay", "u": float(rng.uniform(5e-19, 2e-18)), "renewed": "stay"},
            ],
        }
        for n in range(CLOCKS)
    ]
    sites = [
        {
            "id": f"site {n}",
            "latitude": float(rng.uniform(45.0, 55.0)),
            "longitude": float(rng.uniform(0.0, 15.0)),
            "u_atoms_above_marker": 0.002,
            **({"geopotential_number": 0.0} if n == 0 else {}),
        }
        for n in range(SITES)
    ]
    content = {
        "campaign": {
            "name": "benchmark",
            "tide_system": "zero_tide",
            "reference_site": "site 0",
            "tide": "none",
        },
        "site": sites,
        "clock": clocks,
        "candidate": candidates,
        "plan": {"days": 400.0, "start": "2028-01-01T00:00:00Z", "criterion": criterion},
        "target": {
            "difference": [
                {"from": "site 0", "to": f"site {n}", "u_height": 0.02} for n in range(1, SITES)
            ]
        },
    }
    return Document(Campaign.model_validate(content), Path("benchmark.toml"))


def seconds(function, repeats: int) -> float:  # type: ignore[no-untyped-def]
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        function()
        times.append(time.perf_counter() - start)
    return float(np.median(times))


def run(criterion: str) -> None:
    plan = document(criterion)
    length = 400.0 / CANDIDATES
    sessions = placed_in_time(plan.campaign, {one.id: length for one in plan.campaign.candidates})
    model = plan_model(plan, sessions)
    one = seconds(model.solve, 7)
    problem = allocation_problem(plan).problem
    start = time.perf_counter()
    found = optimise(problem, gap=1e-6)
    taken = time.perf_counter() - start
    start = time.perf_counter()
    whole = round_to_steps(problem, found.w, 1.0)
    rounded = problem.value(whole)
    loss = rounded - found.bound if criterion == "D" else rounded / found.bound - 1.0
    print(
        f"{criterion:8s} gap {found.gap:.1e} after {found.evaluations} factorisations; "
        f"{taken / one:.0f} evaluations of the predicted covariance ({1e3 * one:.0f} ms each); "
        f"rounding gap {loss:.2g} in {(time.perf_counter() - start) / one:.0f} more",
        flush=True,
    )


if __name__ == "__main__":
    for name in ("targets", "A", "D", "E"):
        run(name)
