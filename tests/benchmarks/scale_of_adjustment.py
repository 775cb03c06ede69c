"""Time and memory of large levelling nets, u of every point included.

    python tests/benchmarks/scale_of_adjustment.py [POINTS ...]

Draws irregular nets (a spanning tree and random sides of the triangles between random points, two
lines a point), with known numbers at ten points and published heights of one datum with two tilts
at every twentieth. The reference is a plain sparse factorisation of the same normal matrix in the
same run, with the same ordering. A sample of u is compared with columns of the inverse solved one
by one.
"""

from __future__ import annotations

import resource
import sys
import time

import numpy as np
from scipy import sparse
from scipy.sparse import csgraph
from scipy.sparse.linalg import splu
from scipy.spatial import Delaunay

from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.unknowns import DatumTerm

U_LINE, U_KNOWN, U_PUBLISHED = 0.01, 0.05, 0.06
SPACING = 1000.0
TERMS = {"offset": 2.0, "tilt_north": 1e-6, "tilt_east": -2e-6}


def drawn_sides(rng: np.random.Generator, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Places in m, and two lines a point that join all of them, shape (2 count, 2)."""
    places = rng.uniform(0.0, SPACING * np.sqrt(count), (count, 2))
    corners = Delaunay(places).simplices
    sides = np.unique(
        np.sort(np.vstack([corners[:, [0, 1]], corners[:, [1, 2]], corners[:, [0, 2]]]), axis=1),
        axis=0,
    )
    shape = (count, count)
    graph = sparse.coo_array((rng.uniform(1.0, 2.0, len(sides)), sides.T), shape=shape)
    tree = csgraph.minimum_spanning_tree(graph.tocsr()).tocoo()
    in_tree = np.isin(
        sides @ [count, 1], np.sort(np.column_stack(tree.coords), axis=1) @ [count, 1]
    )
    rest = np.flatnonzero(~in_tree)
    more = rng.choice(rest, 2 * count - np.count_nonzero(in_tree), replace=False)
    return places, sides[np.sort(np.concatenate([np.flatnonzero(in_tree), more]))]


def drawn_net(count: int) -> tuple[LinearModel, np.ndarray]:
    """A net, and the true numbers of its points."""
    rng = np.random.default_rng(count)
    places, sides = drawn_sides(rng, count)
    true = rng.uniform(0.0, 5000.0, count)
    names = [NumberOf(f"p{i}") for i in range(count)]
    builder = ModelBuilder()
    start, end = sides.T
    builder.observe_all(
        [f"line {i}" for i in range(len(sides))],
        kind="levelled",
        values=true[end] - true[start] + U_LINE * rng.standard_normal(len(sides)),
        on=[
            ([names[i] for i in end], np.ones(len(sides))),
            ([names[i] for i in start], -np.ones(len(sides))),
        ],
        variance=U_LINE**2,
    )
    for i in rng.choice(count, 10, replace=False):
        value = true[i] + U_KNOWN * rng.standard_normal()
        builder.observe(
            f"known {i}", kind="known", value=value, on={names[i]: 1.0}, variance=U_KNOWN**2
        )
    in_datum = np.arange(0, count, 20)
    north, east = (places[in_datum] - places.mean(axis=0)).T
    factors = {"offset": -np.ones(in_datum.size), "tilt_north": -north, "tilt_east": -east}
    published = true[in_datum] + sum(size * factors[term] for term, size in TERMS.items())
    builder.observe_all(
        [f"published {i}" for i in in_datum],
        kind="published",
        values=published + U_PUBLISHED * rng.standard_normal(in_datum.size),
        on=[
            ([names[i] for i in in_datum], np.ones(in_datum.size)),
            *((DatumTerm("B", term), factor) for term, factor in factors.items()),
        ],
        variance=U_PUBLISHED**2,
    )
    return builder.build(), true


def memory() -> float:
    """Largest memory of this process so far in GB."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0**2


def measured(count: int) -> None:
    model, true = drawn_net(count)
    begun = time.perf_counter()
    adjustment = adjust_network(model)
    solved = time.perf_counter()
    u = adjustment.u_of_unknowns
    done = time.perf_counter()
    points = np.array([adjustment.place[NumberOf(f"p{i}")] for i in range(count)])
    error = adjustment.estimate[points] - true
    design = adjustment.system.design
    normal = sparse.csc_array(design.T @ design)[:-3, :-3]  # the datum's terms fill any factor
    start = time.perf_counter()
    factor = splu(
        normal, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
    )
    one = time.perf_counter() - start
    times = {"adjusted": solved - begun, "u of all": done - solved, "both": done - begun}
    ratios = [f"{name} {took:.2f} s = {took / one:.1f}" for name, took in times.items()]
    print(
        f"{count} points, {len(model.rows)} rows, factor of {factor.L.nnz / 1e6:.1f} million\n"
        f"  one factorisation {one:.2f} s; {', '.join(ratios)} factorisations; "
        f"memory {memory():.2f} GB"
    )
    z = error / u[points]
    held = 100 * np.mean(np.abs(z) < 1.96)
    datum = [
        (adjustment.value({DatumTerm("B", t): 1.0}) - true_value)
        / adjustment.u({DatumTerm("B", t): 1.0})
        for t, true_value in TERMS.items()
    ]
    sample = np.random.default_rng(1).choice(count, 25, replace=False)
    rough = [adjustment.u({NumberOf(f"p{i}"): 1.0}) for i in sample]
    apart = np.max(np.abs(u[points[sample]] / rough - 1.0))
    print(
        f"  95 % intervals hold {held:.1f} % of the points; chi-squared over freedom "
        f"{adjustment.fit.chi_squared / adjustment.fit.degrees_of_freedom:.4f}; datum terms off by "
        f"{', '.join(f'{one:+.2f}' for one in datum)} u; u against solved columns: {apart:.1e}"
    )


if __name__ == "__main__":
    # The first use of compiled code, once per machine, is not what is measured.
    adjust_network(drawn_net(200)[0], method="sparse").u_of_unknowns  # noqa: B018
    for size in map(int, sys.argv[1:] or ["100000", "1000000"]):
        measured(size)
