"""Several paths of comparators as one estimate, and their loops."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.errors import DataError
from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.combination import combine, loops_of
from clockgeo.frequency.comparator import comparator_from
from clockgeo.frequency.record import Record
from frequency.invented_chain import LASER, SR, YB, entry, printed_chain


def constant(name, places, value):
    tick = np.array(places)
    y = np.broadcast_to(np.asarray(value, dtype=float), tick.shape).copy()
    return Record(name, tick * 10**9, y, np.ones(tick.size, bool), 1.0, tick)


def triangle():
    """A direct way, and one over a transfer laser."""
    entries = [
        entry("EAST_YB", "WEST_SR", nu_b=YB, nu_a=SR),
        entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
    ]
    comparators = {one["name"]: comparator_from(one, where="test") for one in entries}
    return find_chains(comparators, denominator="WEST_SR", numerator="EAST_YB")


def test_several_paths_are_one_estimate():
    """Alone each path is its sum; together the direct way has weight 2/3: variances 1 and 1 + 1."""
    chains = triangle()
    assert [len(chain.links) for chain in chains] == [1, 2]
    outputs = {
        "EAST_YB-WEST_SR": constant("a", range(10), 1e-15),
        "FIBRE_L-WEST_SR": constant("b", range(5, 20), 2e-15),
        "EAST_YB-FIBRE_L": constant("c", range(5, 15), 3e-15),
    }
    combined = combine(chains, outputs, name="both")
    assert (combined.complete, combined.several) == ((10, 10), 5)
    record = combined.record
    np.testing.assert_array_equal(record.tick, np.arange(15))
    np.testing.assert_allclose(record.y[:5], 1e-15, rtol=1e-12)
    np.testing.assert_allclose(record.y[5:10], (2 * 1e-15 + 5e-15) / 3, rtol=1e-12)
    np.testing.assert_allclose(record.y[10:], 5e-15, rtol=1e-12)
    noise = {"EAST_YB-WEST_SR": 2.0, "FIBRE_L-WEST_SR": 3.0}
    weighted = combine(chains, outputs, name="both", noise=noise).record
    direct = (1 / 4) / (1 / 4 + 1 / 10)
    np.testing.assert_allclose(weighted.y[5:10], direct * 1e-15 + (1 - direct) * 5e-15, rtol=1e-12)


def test_what_paths_share_counts_once():
    """Two parallel fibres behind one comb: the shared comparator keeps its full weight."""
    entries = [
        entry("WEST_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_L", "WEST_L", nu_b=LASER, nu_a=LASER),
        entry("MID_L", "WEST_L", nu_b=LASER, nu_a=LASER),
        entry("EAST_L", "MID_L", nu_b=LASER, nu_a=LASER),
        entry("EAST_YB", "EAST_L", nu_b=YB, nu_a=LASER),
    ]
    comparators = {one["name"]: comparator_from(one, where="test") for one in entries}
    chains = find_chains(comparators, denominator="WEST_SR", numerator="EAST_YB")
    rng = np.random.default_rng(8)
    values = {name: 1e-15 * rng.standard_normal(50) for name in comparators}
    outputs = {name: constant(name, range(50), value) for name, value in values.items()}
    record = combine(chains, outputs, name="net").record
    middle = (2.0 * values["EAST_L-WEST_L"] + values["MID_L-WEST_L"] + values["EAST_L-MID_L"]) / 3.0
    expected = values["WEST_L-WEST_SR"] + middle + values["EAST_YB-EAST_L"]
    np.testing.assert_allclose(record.y, expected, rtol=1e-9, atol=1e-30)


def test_the_combination_is_the_best_linear_unbiased_one():
    """A second route: dense generalised least squares of one gate with all oscillators unknown."""
    chains = triangle()
    noise = {"EAST_YB-WEST_SR": 1.7, "FIBRE_L-WEST_SR": 0.6, "EAST_YB-FIBRE_L": 1.1}
    z = {"EAST_YB-WEST_SR": 1e-15, "FIBRE_L-WEST_SR": -2e-15, "EAST_YB-FIBRE_L": 4e-15}
    outputs = {name: constant(name, range(3), value) for name, value in z.items()}
    record = combine(chains, outputs, name="net", noise=noise).record
    # Unknowns: offsets of the transfer laser and of the far clock, against the near clock.
    design = np.array([[0.0, 1.0], [1.0, 0.0], [-1.0, 1.0]])
    weight = np.diag([noise[name] ** -2.0 for name in z])
    normal = design.T @ weight @ design
    estimate = np.linalg.solve(normal, design.T @ weight @ np.array(list(z.values())))
    np.testing.assert_allclose(record.y, estimate[1], rtol=1e-12)


def test_loops_of_comparators_are_found():
    chains = triangle()
    outputs = {
        "EAST_YB-WEST_SR": constant("a", range(10), 1e-15),
        "FIBRE_L-WEST_SR": constant("b", range(5, 20), 2e-15),
        "EAST_YB-FIBRE_L": constant("c", range(5, 15), 3e-15),
    }
    (loop,) = loops_of(chains, outputs)
    np.testing.assert_array_equal(loop.series.tick, np.arange(5, 10))
    np.testing.assert_allclose(np.abs(loop.series.y), 4e-15, rtol=1e-12)
    assert loops_of(chains[:1], outputs) == []


def test_gates_off_the_grid_and_other_intervals_are_refused():
    chain = printed_chain(
        [
            entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
            entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
        ]
    )
    tick = np.arange(20)
    ones = np.ones(20)

    def outputs(shift, interval):
        step = int(interval * 1e9)
        return {
            "FIBRE_L-WEST_SR": Record("one", tick * 10**9, ones, ones > 0, 1.0, tick),
            "EAST_YB-FIBRE_L": Record("two", tick * step + shift, ones, ones > 0, interval, tick),
        }

    with pytest.raises(DataError, match=r"gates do not lie on the grid.*off by 0\.4"):
        combine([chain], outputs(400_000_000, 1.0), name="x")
    with pytest.raises(DataError, match="different gate times"):
        combine([chain], outputs(0, 2.0), name="x")
    with pytest.raises(DataError, match="no valid epoch in common"):
        combine([chain], outputs(100 * 10**9, 1.0), name="x")
