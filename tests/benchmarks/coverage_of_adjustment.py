"""How often the intervals of datum offsets and tilts hold the truth, by simulation.

    python tests/benchmarks/coverage_of_adjustment.py [RUNS]

Draws the tables and records of the example with four datums anew for each seed (without the
blunder), adjusts them, and counts; the share of global tests passed at 95 % is printed too.
"""

from __future__ import annotations

import importlib.util
import shutil
import sys
import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np

from clockgeo.campaign import read_document
from clockgeo.campaign.adjust_tables import global_test
from clockgeo.campaign.assembling import assemble
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.unknowns import DatumTerm
from clockgeo.planning import simulate_records

EXAMPLES = Path(__file__).parents[2] / "examples"
SPEC = importlib.util.spec_from_file_location("invented_datums", EXAMPLES / "invented_datums.py")
datums = importlib.util.module_from_spec(SPEC)
sys.modules["invented_datums"] = datums
SPEC.loader.exec_module(datums)


def drawn(folder: Path, seed: int) -> Path:
    """A document with the example's truth, everything observed drawn with `seed`."""
    truth = datums.drawn_truth(np.random.default_rng(datums.SEED))
    datums.write_tables(folder, truth, np.random.default_rng(seed), blunder=0.0)
    path = folder / "campaign.toml"
    document = read_document(path)
    for old in folder.glob("records/*"):
        old.unlink()
    campaign = document.campaign
    # The reference number is an observation too: it must be drawn about its truth.
    true = campaign.truth.geopotential_numbers
    sites = tuple(
        site.model_copy(
            update={
                "geopotential_number": true[site.id]
                + site.u_geopotential_number * np.random.default_rng(10_000 + seed).normal()
            }
        )
        if site.geopotential_number is not None
        else site
        for site in campaign.sites
    )
    campaign = campaign.model_copy(update={"sites": sites})
    simulate_records(campaign, seed=seed, folder=folder, tables=folder, replace=True)
    return replace(document, campaign=campaign)


def run(runs: int) -> None:
    errors, passed = {}, 0
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name) / "example"
        shutil.copytree(EXAMPLES / "four-datums", folder)
        for seed in range(runs):
            document = drawn(folder, seed)
            assembled = assemble(document)
            adjustment = adjust_network(assembled.model, zero=assembled.zero)
            passed += bool(global_test(adjustment.fit).passed)
            for area in datums.AREAS:
                frame = assembled.rows.datums[area.id]
                north, east = datums.ways_from(area.middle, *frame.origin)
                at_origin = area.offset + area.tilt_north * north + area.tilt_east * east
                true = {
                    "offset": at_origin,
                    "tilt_north": area.tilt_north,
                    "tilt_east": area.tilt_east,
                }
                for term in frame.terms:
                    unknown = {DatumTerm(area.id, term): 1.0 / frame.gravity}
                    error = adjustment.value(unknown) - true[term]
                    pair = (error, adjustment.u(unknown))
                    errors.setdefault((area.id, term), []).append(pair)
    print(f"{runs} runs; global test passed in {100 * passed / runs:.1f} %")
    total = np.zeros(2)
    for (area, term), pairs in errors.items():
        error, u = np.array(pairs).T
        held = [np.mean(np.abs(error) < k * u) for k in (0.994, 1.960)]
        total += held
        print(
            f"{area} {term}: 68 % holds {100 * held[0]:.1f} %, 95 % holds {100 * held[1]:.1f} %, "
            f"bias {np.mean(error):.2e}, scatter {np.std(error):.2e}, u {np.median(u):.2e}"
        )
    mean = 100 * total / len(errors)
    print(f"all: 68 % holds {mean[0]:.1f} %, 95 % holds {mean[1]:.1f} %")


if __name__ == "__main__":
    run(int(sys.argv[1]) if len(sys.argv) > 1 else 200)
