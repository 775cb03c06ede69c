"""Make the tables of the example with four height datums: points, lines, heights, GNSS heights.

Nothing in it is a real place. The truth is drawn first; what is observed follows from it. Equal
seeds give equal files.

    python examples/invented_geoid.py coasts examples/four-datums/quasigeoid.nc
    python examples/invented_datums.py examples/four-datums
    clockgeo simulate examples/four-datums/campaign.toml --seed 5
"""

from __future__ import annotations

import argparse
import csv
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.spatial import Delaunay

from clockgeo.gravity import (
    normal_gravity,
    normal_height,
    number_of_normal_height,
    open_geoid,
    tide_system_shift,
)
from clockgeo.network.datum_plane import ways_from

SEED = 20270
BLUNDER = 0.083
"""m by which one line on the coast was booked wrongly."""


@dataclass(frozen=True)
class Area:
    """Points of one datum; offset in m and tilts in m a metre, positive: its zero lies high."""

    id: str
    south: float
    north: float
    west: float
    east: float
    points: int
    offset: float
    tilt_north: float = 0.0
    tilt_east: float = 0.0
    highest: float = 300.0
    levelled: bool = True

    @property
    def middle(self) -> tuple[float, float]:
        """Where tilts are counted from, degrees."""
        return (self.south + self.north) / 2.0, (self.west + self.east) / 2.0


AREAS = (
    Area("coast", 46.0, 48.2, -44.8, -41.2, 120, 0.183),
    Area("inland", 46.0, 50.0, -41.0, -36.6, 160, -0.312, 2.55e-7, -0.9e-7, 700.0, levelled=False),
    Area("highland", 44.2, 45.8, -44.0, -39.0, 80, 0.417, highest=2200.0),
    Area("island", 44.0, 45.2, -36.0, -34.2, 40, -0.548, highest=500.0),
)
TIES = (("coast", "inland", 3), ("coast", "highland", 3), ("highland", "inland", 1))
SITES = {
    "orrund": (47.10, -43.20),
    "kelvarn": (47.85, -41.60),
    "sistrel": (49.60, -37.30),
    "immertor": (46.50, -37.10),
    "dunvask": (48.30, -39.60),
    "halmer": (45.30, -43.10),
    "brask": (44.60, -39.90),
    "pellworn": (44.30, -35.20),
    "yrsol": (45.00, -34.70),
}
"""The clock sites; each is also a point of the datum it lies in."""


@dataclass(frozen=True, eq=False)
class Truth:
    """All points with what is true of them; arrays of one length."""

    ids: list[str]
    area: np.ndarray
    latitude: np.ndarray
    longitude: np.ndarray
    number: np.ndarray
    gravity: np.ndarray


def drawn_truth(rng: np.random.Generator) -> Truth:
    """Places, heights and gravity of all points."""
    ids, area, latitude, longitude, height = [], [], [], [], []
    for place, one in enumerate(AREAS):
        inside = {
            name: spot
            for name, spot in SITES.items()
            if one.south <= spot[0] <= one.north and one.west <= spot[1] <= one.east
        }
        fresh = one.points - len(inside)
        phi = np.round(rng.uniform(one.south, one.north, fresh), 5)
        lam = np.round(rng.uniform(one.west, one.east, fresh), 5)
        ids += [*inside, *(f"{one.id}-{number:03d}" for number in range(1, fresh + 1))]
        latitude += [*(spot[0] for spot in inside.values()), *phi]
        longitude += [*(spot[1] for spot in inside.values()), *lam]
        area += [place] * one.points
        rough = rng.beta(1.5, 4.0, one.points)
        height += list(np.round(5.0 + one.highest * rough, 3))
    phi, lam = np.array(latitude), np.array(longitude)
    number = np.asarray(number_of_normal_height(np.array(height), phi))
    anomaly = 3e-4 * rng.standard_normal(phi.size)
    gravity = np.round(np.asarray(normal_gravity(phi, np.array(height))) + anomaly, 6)
    return Truth(ids, np.array(area), phi, lam, number, gravity)


def edges(truth: Truth, rng: np.random.Generator) -> Iterator[tuple[int, int]]:
    """Which points are levelled to which: neighbours in levelled areas, and a few ties."""
    for place, one in enumerate(AREAS):
        members = np.flatnonzero(truth.area == place)
        if not one.levelled:
            continue
        flat = np.column_stack([truth.latitude[members], 0.7 * truth.longitude[members]])
        sides = {
            tuple(sorted((int(a), int(b))))
            for triangle in Delaunay(flat).simplices
            for a, b in zip(triangle, np.roll(triangle, 1), strict=True)
        }
        for a, b in sorted(sides):
            if rng.random() < 0.8 or np.hypot(*(flat[a] - flat[b])) < 0.15:
                yield int(members[a]), int(members[b])
    names = [one.id for one in AREAS]
    for first, second, count in TIES:
        here, there = (np.flatnonzero(truth.area == names.index(n)) for n in (first, second))
        apart = np.hypot(
            truth.latitude[here][:, None] - truth.latitude[there][None, :],
            0.7 * (truth.longitude[here][:, None] - truth.longitude[there][None, :]),
        )
        for flat_place in np.argsort(apart, axis=None)[:count]:
            a, b = np.unravel_index(flat_place, apart.shape)
            yield int(here[a]), int(there[b])


def line_rows(truth: Truth, rng: np.random.Generator, blunder: float) -> Iterator[list[object]]:
    """Levelled height differences; 1 mm for the root of a kilometre, and one blunder."""
    for number, (a, b) in enumerate(edges(truth, rng)):
        north, east = ways_from(
            (truth.latitude[a], truth.longitude[a]), truth.latitude[b], truth.longitude[b]
        )
        length = round(1.3 * float(np.hypot(north, east)), 0)
        gravity = (truth.gravity[a] + truth.gravity[b]) / 2.0
        rise = (truth.number[b] - truth.number[a]) / gravity
        rise += 1e-3 * np.sqrt(length / 1000.0) * rng.standard_normal()
        rise += blunder if number == 97 else 0.0
        yield [truth.ids[a], truth.ids[b], f"{rise:.5f}", f"{length:.0f}"]


def published_rows(truth: Truth, one: Area, rng: np.random.Generator) -> Iterator[list[object]]:
    """Heights as a datum publishes them: too low by its offset and tilts."""
    members = np.flatnonzero(truth.area == AREAS.index(one))
    north, east = ways_from(
        one.middle,
        truth.latitude[members],
        truth.longitude[members],
    )
    height = np.asarray(normal_height(truth.number[members], truth.latitude[members]))
    published = height - one.offset - one.tilt_north * north - one.tilt_east * east
    published += 0.006 * rng.standard_normal(members.size)
    for member, value in zip(members, published, strict=True):
        yield [truth.ids[member], f"{value:.4f}"]


def gnss_rows(truth: Truth, grid: Path, rng: np.random.Generator) -> Iterator[list[object]]:
    """Tide-free ellipsoidal heights at sites and some points, with a geoid that errs smoothly."""
    model = open_geoid(grid)
    others = np.flatnonzero(~np.isin(truth.ids, list(SITES)))
    chosen = np.sort(
        np.concatenate(
            [np.flatnonzero(np.isin(truth.ids, list(SITES))), rng.choice(others, 31, replace=False)]
        )
    )
    phi, lam = truth.latitude[chosen], truth.longitude[chosen]
    errors = np.linalg.cholesky(model.covariance(phi, lam) + 1e-12 * np.eye(chosen.size))
    surface = model.sample(phi, lam) + errors @ rng.standard_normal(chosen.size)
    height = np.asarray(normal_height(truth.number[chosen], phi)) + surface
    height += 0.008 * rng.standard_normal(chosen.size)
    height += tide_system_shift("ellipsoidal_height", phi, source="zero_tide", target="tide_free")
    for member, value in zip(chosen, height, strict=True):
        yield [truth.ids[member], f"{value:.4f}"]


def write(path: Path, header: list[str], rows: Iterable[list[object]]) -> None:
    """Write one table."""
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


def write_tables(
    folder: Path, truth: Truth, rng: np.random.Generator, *, blunder: float = BLUNDER
) -> None:
    """Draw what is observed of a truth, and write all tables into `folder`."""
    write(
        folder / "points.csv",
        ["id", "latitude", "longitude", "gravity"],
        (
            [name, f"{phi:.5f}", f"{lam:.5f}", f"{g:.6f}"]
            for name, phi, lam, g in zip(
                truth.ids, truth.latitude, truth.longitude, truth.gravity, strict=True
            )
        ),
    )
    lines = line_rows(truth, rng, blunder)
    write(folder / "lines.csv", ["from", "to", "height_difference", "length"], lines)
    for one in AREAS:
        write(folder / f"{one.id}.csv", ["point", "height"], published_rows(truth, one, rng))
    rows = gnss_rows(truth, folder / "quasigeoid.nc", rng)
    write(folder / "gnss.csv", ["point", "ellipsoidal_height"], rows)


def make(folder: Path) -> None:
    """Write all tables of the example, and say what is true of its sites."""
    rng = np.random.default_rng(SEED)
    truth = drawn_truth(rng)
    write_tables(folder, truth, rng)
    for name in SITES:
        print(f"{name} = {truth.number[truth.ids.index(name)]:.4f}")


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description="Make the tables of the four-datums example.")
    parser.add_argument("folder", type=Path)
    make(parser.parse_args().folder)
