"""Predicted against realised u of the two example plans, by simulation.

    python tests/benchmarks/plan_against_simulation.py [RUNS] [EXAMPLE ...]

Every run draws the records of the planned sessions, levels them as measured ones, and compares the
result with the truth. Prints the root mean square of the errors beside the prediction, with the
limits that hold it in 95 % of all such simulations if the prediction is right.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

from clockgeo.campaign import read_document
from clockgeo.planning import confirm, goals_of, plan

EXAMPLES = Path(__file__).parents[2] / "examples"
PLANS = ("harrow-line", "lantern-islands")


def run(runs: int, name: str) -> None:
    document = read_document(EXAMPLES / name / "campaign.toml")
    prediction = plan(document).prediction
    done = confirm(document, prediction, goals_of(prediction.model), runs=runs)
    print(f"{name}: {runs} campaigns")
    for column, one in enumerate(done.result.targets):
        errors = done.errors[:, column]
        print(
            f"  {one.from_end} to {one.to_end}: predicted {1e3 * one.predicted_u:.2f} mm, "
            f"realised {1e3 * one.realised_u:.2f} mm "
            f"(expected {1e3 * one.lower:.2f} to {1e3 * one.upper:.2f}), "
            f"mean error {1e3 * np.mean(errors):.2f} +- {1e3 * np.std(errors) / runs**0.5:.2f} mm, "
            f"median of the stated u {1e3 * one.stated_u:.2f} mm: "
            f"{'agrees' if one.agrees else 'DISAGREES'}",
            flush=True,
        )


if __name__ == "__main__":
    for example in sys.argv[2:] or PLANS:
        run(int(sys.argv[1]) if len(sys.argv) > 1 else 200, example)
