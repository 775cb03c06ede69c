"""Thirty days of a chain of five comparators at 1 s, against reading the columns as floats.

python tests/benchmarks/chain_speed.py [DAYS]
"""

from __future__ import annotations

import resource
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import polars as pl

from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.combination import combine
from clockgeo.frequency.exchange import read_exchange, read_outputs
from clockgeo.frequency.record import Record

NAMES = ["C_YB-C_L", "C_L-B_L", "B_L-A_L", "A_L-A_M", "A_M-A_SR"]


def written(folder: Path, days: int) -> None:
    """Headers and data of five comparators, MJD with six decimals."""
    header = "".join(
        f"- name: {name}\n  numrhoBA: 1\n  denrhoBA: 1\n  sB: 1e14\n  nu0A: 1e14\n"
        "  interval: 1\n  lag: 1\n"
        for name in NAMES
    )
    (folder / "net.yml").write_text(header, encoding="utf-8")
    rng = np.random.default_rng(1)
    rows = np.arange(86_400 * days)
    for name in NAMES:
        kept = rows[rng.random(rows.size) < 0.95]
        frame = pl.DataFrame(
            {
                "mjd": np.char.mod("%.6f", 61_500 + (kept + 1) / 86_400),
                "output": np.char.mod("%.6e", 1e-15 * rng.standard_normal(kept.size)),
                "flag": np.full(kept.size, 2),
            }
        )
        (folder / name).mkdir()
        frame.write_csv(folder / name / "all.dat", separator="\t", include_header=False)


def run(days: int, times: int = 5) -> None:
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        written(folder, days)
        floats = min(timed(read_floats, folder)[0] for _ in range(times))
        whole, record = min((timed(combined, folder) for _ in range(times)), key=lambda one: one[0])
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    print(f"{days} days, {5 * 86_400 * days} rows, {len(record)} common epochs; best of {times}")
    print(f"polars floats {floats:.2f} s, read + aligned + averaged {whole:.2f} s: "
          f"{whole / floats:.2f} times; at most {memory:.2f} GB")  # fmt: skip


def timed(job: Callable[[Path], Any], folder: Path) -> tuple[float, Any]:
    begin = time.perf_counter()
    done = job(folder)
    return time.perf_counter() - begin, done


def read_floats(folder: Path) -> None:
    for name in NAMES:
        pl.read_csv(
            folder / name / "all.dat",
            separator="\t",
            has_header=False,
            schema_overrides=[pl.Float64, pl.Float64, pl.Int64],
        )


def combined(folder: Path) -> Record:
    exchange = read_exchange(folder)
    chains = find_chains(exchange.comparators, denominator="A_SR", numerator="C_YB")
    record = combine(chains, read_outputs(exchange, NAMES), name="chain").record
    assert np.isfinite(record.y.mean())
    return record


if __name__ == "__main__":
    run(int(sys.argv[1]) if len(sys.argv) > 1 else 30)
