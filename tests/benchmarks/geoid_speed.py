"""Speed of sampling a geoid grid at a million points, against pyproj on the same grid, in one run.

python tests/benchmarks/geoid_speed.py
"""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from pyproj import Transformer

from clockgeo.files import shipped_grid
from clockgeo.gravity import open_geoid, write_geoid

POINTS = 1_000_000
ROUNDS = 5


def fastest(work: Callable[[], object]) -> float:
    """Seconds of the fastest of several rounds, after one to warm up."""
    work()
    times = []
    for _ in range(ROUNDS):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> None:
    rng = np.random.default_rng(1)
    latitude = np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, POINTS)))
    longitude = rng.uniform(-180.0, 180.0, POINTS)
    model = open_geoid(shipped_grid("egm96_15.nc"))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "egm96.gtx"
        write_geoid(model, path)
        other = Transformer.from_pipeline(
            "+proj=pipeline +step +proj=unitconvert +xy_in=deg +xy_out=rad "
            f"+step +proj=vgridshift +grids={path} +multiplier=1"
        )
        heights = np.zeros(POINTS)
        reference = fastest(lambda: other.transform(longitude, latitude, heights))
        apart = other.transform(longitude, latitude, heights)[2]
        print(f"{POINTS} points, pyproj vgridshift: {reference * 1e3:.0f} ms")
        for method in ("bilinear", "biquadratic", "bicubic"):
            own = fastest(lambda m=method: model.sample(latitude, longitude, interpolation=m))
            print(f"{method:12} {own * 1e3:6.0f} ms, {reference / own:5.1f} times as fast")
        worst = np.max(np.abs(model.sample(latitude, longitude) - apart))
        print(f"bilinear differs by at most {worst * 1e3:.3f} mm")
        opening = fastest(lambda: open_geoid(shipped_grid("egm96_15.nc")))
        print(f"opening the global grid: {opening * 1e3:.0f} ms")


if __name__ == "__main__":
    main()
