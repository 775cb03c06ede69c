"""The command stability on 2.6 million rows against reading the file alone (aim: at most 3)."""

from __future__ import annotations

import os
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

os.environ["OPENBLAS_NUM_THREADS"] = "1"  # threads that wait for a busy machine count as work

import numpy as np
from typer.testing import CliRunner

from clockgeo.cli import app
from clockgeo.frequency import RecordLayout, read_record, write_record
from clockgeo.times import SECOND_NS, tai_from_iso

ROWS = 2_600_000


def shortest(work: Callable[[], object], repeats: int) -> float:
    """Shortest of several times of the processors (all threads), s."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


def main() -> None:
    """Print both times and their ratio."""
    rng = np.random.default_rng(20270301)
    y = rng.normal(0.0, 1e-16, ROWS)
    y[rng.random(ROWS // 100).argsort()[: ROWS // 1000] * 100] = np.nan
    for start in rng.integers(0, ROWS, 100):
        y[start : start + 2_600] = np.nan
    tai = tai_from_iso("2027-03-01T00:00:00Z") + np.arange(ROWS) * SECOND_NS
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "month.txt"
        layout = RecordLayout(file=path.name)
        write_record(path, tai, y, layout=layout, stamp_decimals=6)
        reading = shortest(lambda: read_record(layout, base=Path(folder), name="month"), 3)
        runner = CliRunner()
        done = []
        whole = shortest(
            lambda: done.append(runner.invoke(app, ["stability", str(path), "--json"])), 3
        )
    codes = {one.exit_code for one in done}
    print(f"exit codes {codes}; reading {reading:.2f} s, the whole command {whole:.2f} s")
    print(f"ratio {whole / reading:.2f} (aim <= 3)")


if __name__ == "__main__":
    main()
