"""Make an invented geoid model: a plane and waves that get weaker as they get shorter.

Nothing in it is a real place. The same region and seed always give the same values.

    python examples/invented_geoid.py saddle grids/saddle_quasigeoid.nc
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass

import numpy as np

from clockgeo.gravity import ErrorModel, GeoidModel, GridTile, TideSystem, write_geoid, zero_level


@dataclass(frozen=True)
class Region:
    """Where an invented model reaches, and how rough it is.

    Angles are in degrees, heights in m, slopes in m a degree; `longest` is the longest wave.
    """

    south: float
    north: float
    west: float
    east: float
    level: float
    slope_north: float
    slope_east: float
    amplitude: float
    longest: float
    u: float
    correlation_length: float
    quantity: str = "height_anomaly"
    source: str = "invented quasigeoid of an invented region, for examples only"
    step: float = 1.5 / 60.0
    waves: int = 24
    seed: int = 7

    @property
    def latitudes(self) -> np.ndarray:
        """Of the nodes, from south to north."""
        return self.south + self.step * np.arange(round((self.north - self.south) / self.step) + 1)

    @property
    def longitudes(self) -> np.ndarray:
        """Of the nodes, from west to east."""
        return self.west + self.step * np.arange(round((self.east - self.west) / self.step) + 1)

    def heights(self) -> np.ndarray:
        """Invented heights of the zero surface at the nodes, m."""
        rng = np.random.default_rng(self.seed)
        phi, lam = np.meshgrid(self.latitudes, self.longitudes, indexing="ij")
        north = phi - (self.south + self.north) / 2.0
        east = lam - (self.west + self.east) / 2.0
        narrowing = round(float(np.cos(np.radians((self.south + self.north) / 2.0))), 2)
        heights = self.level + self.slope_north * north + self.slope_east * east
        for number in range(1, self.waves + 1):
            direction, phase = rng.uniform(0.0, 2.0 * np.pi, 2)
            along = np.cos(direction) * north + np.sin(direction) * narrowing * east
            cycles = along * number / self.longest
            heights += self.amplitude / number**1.4 * np.sin(2.0 * np.pi * cycles + phase)
        return heights


REGIONS = {
    "saddle": Region(
        south=46.0,
        north=48.0,
        west=10.0,
        east=13.0,
        level=48.4,
        slope_north=0.6,
        slope_east=-0.4,
        amplitude=0.9,
        longest=3.0,
        u=0.02,
        correlation_length=60_000.0,
        source="invented quasigeoid of an invented mountain region, for examples only",
    ),
    "coasts": Region(
        south=43.5,
        north=50.5,
        west=-46.0,
        east=-33.0,
        level=52.0,
        slope_north=0.9,
        slope_east=-0.5,
        amplitude=1.6,
        longest=9.0,
        u=0.04,
        correlation_length=150_000.0,
        source="invented quasigeoid of invented coasts, for examples only",
        step=0.1,
    ),
}


def invented_model(region: Region) -> GeoidModel:
    """Model of a region: zero-tide, above GRS80, its zero level that of the height reference."""
    return GeoidModel(
        name="invented",
        tiles=(GridTile(region.south, region.west, region.step, region.step, region.heights()),),
        quantity=region.quantity,
        tide_system=TideSystem.ZERO_TIDE,
        zero_level=zero_level("height_reference"),
        ellipsoid="grs80",
        errors=ErrorModel(u=region.u, correlation_length=region.correlation_length),
        epoch=2025.0,
        source=region.source,
    )


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description="Make an invented geoid model.")
    parser.add_argument("region", choices=sorted(REGIONS))
    parser.add_argument("path", help="file to write, .nc or .ggxf")
    parser.add_argument("--force", action="store_true", help="replace an existing file")
    given = parser.parse_args()
    packed = 1e-4 if given.path.endswith(".nc") else None
    write_geoid(
        invented_model(REGIONS[given.region]), given.path, resolution=packed, replace=given.force
    )
