"""Three sites, four clocks, two links, drawn many times: do heights and correlations hold?

    python tests/benchmarks/coverage_of_networks.py [RUNS]

All sessions run over the same ten days, so that clocks and links are shared by noise as well as by
their effects. Prints how often the intervals of both differences hold the truth, chi-squared of
both together with their stated covariance, and the stated against the realised correlation.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
from scipy import stats

from clockgeo.campaign import Campaign, level_measured, measure_record
from clockgeo.planning import simulate_sessions
from clockgeo.progress import track

NUMBERS = {"quay": 96.40, "heath": 1210.75, "ridge": 4032.10}
PAIRS = [
    ("heath sr", "quay sr", ["low fibre"]),
    ("heath sr", "quay yb", ["low fibre"]),
    ("ridge sr", "heath sr", ["high fibre"]),
    ("ridge sr", "quay sr", ["low fibre", "high fibre"]),
    ("quay yb", "quay sr", []),
]


def document() -> Campaign:
    """The invented network."""
    sites = [
        {"id": name, "latitude": 50.0 + 0.4 * k, "longitude": -20.0 + k, "gravity": 9.81}
        for k, name in enumerate(NUMBERS)
    ]
    sites[0] |= {"geopotential_number": NUMBERS["quay"]}
    shared = {"name": "black-body radiation, coefficient", "u": 1.5e-18, "shared": "strontium"}

    def clock(name: str, transition: str, u: float) -> dict[str, object]:
        own = {"name": "lattice light", "u": u}
        return {
            "id": name,
            "transition": transition,
            "instability": {"white_fm": 6e-16, "flicker_fm": 8e-19},
            "effect": [shared, own] if transition == "87Sr" else [own],
        }

    def link(name: str) -> dict[str, object]:
        noise = {"white_fm": 3e-16, "flicker_fm": 2e-19}
        return {"id": name, "instability": noise, "effect": [{"name": "ends", "u": 4e-19}]}

    sessions = [
        {
            "id": f"{n} - {d}",
            "numerator": {"clock": n, "site": n.split()[0]},
            "denominator": {"clock": d, "site": d.split()[0]},
            "links": links,
            "start": "2027-09-06T00:00:00Z",
            "hours": 240.0,
            "uptime": 0.7,
        }
        for n, d, links in PAIRS
    ]
    return Campaign.model_validate(
        {
            "campaign": {
                "name": "quay, heath and ridge",
                "tide_system": "zero_tide",
                "reference_site": "quay",
                "tide": "none",
                "scatter": "none",
            },
            "site": sites,
            "clock": [
                clock("quay sr", "87Sr", 2e-18),
                clock("quay yb", "171Yb", 1.8e-18),
                clock("heath sr", "87Sr", 2.5e-18),
                clock("ridge sr", "87Sr", 3e-18),
            ],
            "link": [link("low fibre"), link("high fibre")],
            "nominal_ratio": [{"numerator": "171Yb", "denominator": "87Sr", "u": 4e-18}],
            "session": sessions,
            "truth": {"geopotential_numbers": NUMBERS, "interval": 60.0},
        }
    )


def run(runs: int) -> None:
    campaign, place = document(), Path()
    errors, covariances, freedoms = [], [], []
    for seed in track(range(runs), "campaigns", runs):
        drawn = simulate_sessions(campaign, np.random.default_rng(seed), tables=place)
        measured = [
            measure_record(campaign, one.session, one.record(), folder=place) for one in drawn
        ]
        result = level_measured(campaign, measured, folder=place).result
        found = {site.id: site.geopotential_number for site in result.sites}
        order = result.covariance.order
        step = np.array([[(s == o) - (s == "quay") for s in order] for o in ("heath", "ridge")])
        errors.append(step @ np.array([found[name] - NUMBERS[name] for name in order]))
        covariances.append(step @ np.array(result.covariance.matrix) @ step.T)
        both = [d for d in result.differences if d.from_site == "quay"]
        freedoms.append([d.degrees_of_freedom or 1e9 for d in both])
    report(np.array(errors), np.array(covariances), np.array(freedoms))


def report(errors: np.ndarray, covariances: np.ndarray, freedoms: np.ndarray) -> None:
    runs = len(errors)
    u = np.sqrt(np.diagonal(covariances, axis1=1, axis2=2))
    for share in (0.68, 0.95):
        held = np.abs(errors) <= stats.t.ppf(0.5 + share / 2, freedoms) * u
        limits = 200 * np.sqrt(share * (1 - share) / runs)
        print(
            f"{100 * share:.0f} % holds {100 * held[:, 0].mean():.1f} % (quay to heath) and "
            f"{100 * held[:, 1].mean():.1f} % (quay to ridge), two standard deviations {limits:.1f}"
        )
    squares = np.array(
        [e @ np.linalg.solve(c, e) for e, c in zip(errors, covariances, strict=True)]
    )
    inside = 100 * np.mean(squares < stats.chi2.ppf(0.95, 2))
    print(f"chi-squared of both: mean {squares.mean():.2f} (expected 2), 95 % holds {inside:.1f} %")
    stated = np.median(covariances[:, 0, 1] / (u[:, 0] * u[:, 1]))
    realised = np.corrcoef(errors.T)[0, 1]
    doubt = 2 * (1 - realised**2) / np.sqrt(runs)
    print(f"correlation stated {stated:.3f}, realised {realised:.3f} +- {doubt:.3f}")


if __name__ == "__main__":
    run(int(sys.argv[1]) if len(sys.argv) > 1 else 300)
