"""Reading 2 000 000 rows exactly against polars reading the same columns as floats (aim: <= 3)."""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import polars as pl

from clockgeo.frequency import RecordLayout, exact_number, read_record, write_record
from clockgeo.times import SECOND_NS, tai_from_iso

ROWS = 2_000_000
NOMINAL = exact_number("1.207507039343337849")


def shortest(work: Callable[[], object], repeats: int = 5) -> float:
    """Shortest of several run times, s."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> None:
    """Print the time of each way to read, and the ratio to polars' floats."""
    rng = np.random.default_rng(20270301)
    tai = tai_from_iso("2027-03-01T00:00:00Z") + np.arange(ROWS) * SECOND_NS
    y = rng.normal(0.0, 1e-16, ROWS)
    with tempfile.TemporaryDirectory() as folder:
        for value in ("ratio", "fractional", "offset"):
            layout = RecordLayout(file=f"{value}.txt", value=value)
            path = Path(folder) / f"{value}.txt"
            write_record(
                path,
                tai,
                y,
                layout=layout,
                nominal_ratio=NOMINAL,
                carrier=exact_number("429228004229872.99"),
                stamp_decimals=6,
                ratio_digits=20,
            )
            schema = {"time": pl.Float64, "value": pl.Float64}
            floats = shortest(
                lambda: pl.read_csv(path, separator="\t", has_header=False, schema=schema)  # noqa: B023
            )
            exact = shortest(
                lambda: read_record(
                    layout,  # noqa: B023
                    base=Path(folder),
                    name=value,  # noqa: B023
                    nominal_ratio=NOMINAL,
                    carrier=exact_number("429228004229872.99"),
                )
            )
            print(
                f"{value:10}  polars floats {floats:.3f} s  record {exact:.3f} s  "
                f"ratio {exact / floats:.2f}"
            )


if __name__ == "__main__":
    main()
