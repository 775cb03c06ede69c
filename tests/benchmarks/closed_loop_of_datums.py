"""Closed loop of five height systems: how often intervals hold the truth, and the global test.

    python tests/benchmarks/closed_loop_of_datums.py [RUNS]

Five systems of 900 km by 600 km with 800 levelled points each, offsets from -0.55 to +0.42 m, two
of them tilted by 23 cm on 900 km; no line joins them. A transportable clock visits nine sites, and
60 points have GNSS heights with a geoid whose errors are correlated over 300 km. Observations are
drawn by hand from the truth, not with the design matrix of the adjustment. At the end one system
of which only heights are left, with two clock sites on a meridian and no GNSS heights, says what it
cannot tell. The way through files and records is measured by coverage_of_adjustment.py.
"""

from __future__ import annotations

import sys
import time
from dataclasses import dataclass

import numpy as np
from scipy import stats
from scipy.spatial import Delaunay

from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.adjustment import Adjustment, adjust_network
from clockgeo.network.identifiability import identify
from clockgeo.network.unknowns import DatumTerm, GeoidTerm

G = 9.81
WIDE, HIGH, EACH = 900e3, 600e3, 800
SYSTEMS = ("alder", "birch", "cedar", "dogwood", "elm")
OFFSETS = G * np.array([-0.55, 0.42, 0.10, -0.27, 0.31])
TILTS = G * np.array([[0, 0], [0.23 / WIDE, 0], [0, 0], [0, -0.23 / WIDE], [0, 0]])
"""North and east, m2 s-2 a metre."""
CLOCK_SITES = (0, 1, EACH, EACH + 1, 2 * EACH, 3 * EACH, 3 * EACH + 1, 4 * EACH, 4 * EACH + 1)
U_KNOWN, U_PUBLISHED, U_GNSS = 0.5, 0.08, 0.08
U_GEOID, REACH, GEOID_BIAS = 0.03 * G, 300e3, 0.2
U_CLOCK, U_STAY, U_SESSION = 0.2, 0.1, 0.15
"""m2 s-2: of the transportable clock for good, at each site, and of each of two sessions there."""


@dataclass(frozen=True, eq=False)
class Net:
    """What stays the same in all runs; places in m within each system and over all."""

    north: np.ndarray
    east: np.ndarray
    system: np.ndarray
    over: np.ndarray
    number: np.ndarray
    lines: np.ndarray
    u_lines: np.ndarray
    gnss: np.ndarray

    @property
    def names(self) -> list[NumberOf]:
        return [NumberOf(f"p{i}") for i in range(self.number.size)]


def drawn_net(rng: np.random.Generator) -> Net:
    count = EACH * len(SYSTEMS)
    system = np.repeat(np.arange(len(SYSTEMS)), EACH)
    north = rng.uniform(-HIGH / 2, HIGH / 2, count)
    east = rng.uniform(-WIDE / 2, WIDE / 2, count)
    over = np.column_stack([north + HIGH * (system // 3), east + WIDE * (system % 3)])
    lines = []
    for one in range(len(SYSTEMS)):
        members = np.flatnonzero(system == one)
        for corners in Delaunay(over[members]).simplices:
            lines += [sorted(members[corners[[a, b]]]) for a, b in ((0, 1), (1, 2), (0, 2))]
    lines = np.unique(np.array(lines), axis=0)
    length = np.hypot(*(over[lines[:, 0]] - over[lines[:, 1]]).T)
    gnss = np.concatenate([CLOCK_SITES, rng.choice(np.arange(10, count), 51, replace=False)])
    number = rng.uniform(0.0, 8000.0, count)
    return Net(north, east, system, over, number, lines, G * 1e-3 * np.sqrt(length / 1e3), gnss)


def observed(net: Net, rng: np.random.Generator) -> LinearModel:
    """All observations, drawn anew."""
    builder, names = ModelBuilder(), net.names
    start, end = net.lines.T
    builder.observe_all(
        [f"line {i}" for i in range(len(net.lines))],
        kind="levelled",
        values=net.number[end] - net.number[start] + net.u_lines * rng.normal(size=len(net.lines)),
        on=[([names[i] for i in end], 1.0), ([names[i] for i in start], -1.0)],
        variance=net.u_lines**2,
    )
    for one, name in enumerate(SYSTEMS):
        members = np.flatnonzero(net.system == one)
        published = net.number[members] - OFFSETS[one]
        published = published - TILTS[one] @ [net.north[members], net.east[members]]
        builder.observe_all(
            [f"{name}: p{i}" for i in members],
            kind="published",
            values=published + U_PUBLISHED * rng.normal(size=EACH),
            on=[
                ([names[i] for i in members], 1.0),
                (DatumTerm(name, "offset"), -1.0),
                (DatumTerm(name, "tilt_north"), -net.north[members]),
                (DatumTerm(name, "tilt_east"), -net.east[members]),
            ],
            variance=U_PUBLISHED**2,
        )
    apart = net.over[net.gnss][:, None, :] - net.over[net.gnss][None, :, :]
    covariance = U_GEOID**2 * np.exp(-np.hypot(*np.moveaxis(apart, 2, 0)) / REACH)
    covariance += U_GNSS**2 * np.eye(net.gnss.size)
    errors = np.linalg.cholesky(covariance) @ rng.normal(size=net.gnss.size)
    rows = [f"gnss p{i}" for i in net.gnss]
    builder.observe_all(
        rows,
        kind="gnss",
        values=net.number[net.gnss] - GEOID_BIAS + errors,
        on=[([names[i] for i in net.gnss], 1.0), (GeoidTerm("geoid", "offset"), -1.0)],
    )
    builder.correlate(rows, covariance)
    add_clocks(builder, net, CLOCK_SITES, rng)
    return builder.build()


def add_clocks(
    builder: ModelBuilder, net: Net, sites: tuple[int, ...], rng: np.random.Generator
) -> None:
    """The known number of the first site, and two sessions against it at each of the others."""
    names, home = net.names, sites[0]
    known = net.number[home] + U_KNOWN * rng.normal()
    builder.observe("known", kind="known", value=known, on={names[home]: 1.0}, variance=U_KNOWN**2)
    for_good = rng.normal()
    for site in sites[1:]:
        stay = rng.normal()
        for session in range(2):
            rise = net.number[site] - net.number[home] + U_CLOCK * for_good + U_STAY * stay
            builder.observe(
                f"clock {session} at p{site}",
                kind="clock",
                value=rise + U_SESSION * rng.normal(),
                on={names[site]: 1.0, names[home]: -1.0},
                effects={"clock": U_CLOCK, f"stay at p{site}": U_STAY},
                variance=U_SESSION**2,
            )


def errors_in_u(adjustment: Adjustment, net: Net) -> np.ndarray:
    """Errors over u: offsets and tilts, geoid bias, offsets between systems, some points."""
    truth = [({GeoidTerm("geoid", "offset"): 1.0}, GEOID_BIAS)]
    for one, name in enumerate(SYSTEMS):
        terms = zip(("offset", "tilt_north", "tilt_east"), (OFFSETS[one], *TILTS[one]), strict=True)
        truth += [({DatumTerm(name, term): 1.0}, value) for term, value in terms]
        if one:
            pair = {DatumTerm(name, "offset"): 1.0, DatumTerm(SYSTEMS[0], "offset"): -1.0}
            truth.append((pair, OFFSETS[one] - OFFSETS[0]))
    truth += [({net.names[i]: 1.0}, net.number[i]) for i in range(37, net.number.size, 400)]
    combinations = [combination for combination, _ in truth]
    u = np.sqrt(np.diag(adjustment.covariance(combinations)))
    return np.array([adjustment.value(c) - true for c, true in truth]) / u


def run(runs: int) -> None:
    rng = np.random.default_rng(46)
    net = drawn_net(rng)
    passed, errors, known = 0, [], None
    limits = stats.norm.ppf([0.84134, 0.975])
    begun = time.perf_counter()
    for _ in range(runs):
        model = observed(net, rng)
        known = identify(model) if known is None else known
        adjustment = adjust_network(model, known=known)
        freedom = adjustment.fit.degrees_of_freedom
        low, high = stats.chi2.ppf([0.025, 0.975], freedom)
        passed += low < adjustment.fit.chi_squared < high
        errors.append(errors_in_u(adjustment, net))
    found = np.array(errors)
    print(
        f"{runs} runs, {len(model.rows)} observations of {len(net.number)} points, "
        f"{(time.perf_counter() - begun) / runs:.2f} s a run\n"
        f"global test at 95 % passed in {100 * passed / runs:.1f} %"
    )
    for text, part in (("datum terms and pairs", found[:, :20]), ("points", found[:, 20:])):
        held = [100 * np.mean(np.abs(part) < limit) for limit in limits]
        spread = 100 * np.std(np.mean(np.abs(part) < limits[1], axis=1)) / np.sqrt(runs)
        print(
            f"{text}: 68 % holds {held[0]:.1f} %, 95 % holds {held[1]:.1f} % (± {spread:.1f} %), "
            f"scatter over u {np.std(part):.3f}, worst mean {np.abs(part.mean(axis=0)).max():.2f} u"
        )
    for name in SYSTEMS:
        u = [adjustment.u({DatumTerm(name, t): 1.0 / G}) for t in ("offset", "tilt_east")]
        print(
            f"  {name}: u of offset {u[0] * 1e3:.0f} mm, of tilt east {u[1] * WIDE * 1e3:.0f} mm "
            "on 900 km"
        )
    two_sites(net, rng)


def two_sites(net: Net, rng: np.random.Generator) -> None:
    """A system without lines or GNSS heights: two sites on a meridian are all that tells of it."""
    builder, names, far = ModelBuilder(), net.names, EACH + 1
    add_clocks(builder, net, (EACH, far), rng)
    for i in (EACH, far, *range(2, 9)):
        north, east = net.north[i], 0.0 if i in (EACH, far) else net.east[i]
        on = {names[i]: 1.0, DatumTerm("birch", "offset"): -1.0}
        on |= {DatumTerm("birch", "tilt_north"): -north, DatumTerm("birch", "tilt_east"): -east}
        value = net.number[i] - OFFSETS[1] - TILTS[1] @ [north, east]
        builder.observe(f"birch: p{i}", kind="published", value=value, on=on, variance=0.01)
    for gap in identify(builder.build()).gaps:
        print(f"not determined: {gap.text}")


if __name__ == "__main__":
    run(int(sys.argv[1]) if len(sys.argv) > 1 else 200)
