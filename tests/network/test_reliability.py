"""Reliability by simulation and identities: what tests find, and how often they err."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.blunders import find_blunders
from clockgeo.network.critical_values import critical_residual
from clockgeo.network.loops import loop_misclosures
from clockgeo.network.reliability import reliability_of
from clockgeo.network.robust import adjust_robustly
from small_nets import grid_net, level_net

RUNS = 3000


def test_a_bias_of_the_detectable_size_is_found_as_often_as_stated():
    """Power 80 % and false alarms 0.1 %, within binomial limits of three standard deviations."""
    model, _ = grid_net(np.random.default_rng(0))
    reliability = reliability_of(adjust_network(model))
    row = 5
    bias = reliability.minimal_detectable_bias[row]
    rng = np.random.default_rng(1)
    # The test is linear in the observations: w = (P v)/sqrt(M), and P v are the columns of M.
    columns = reliability.columns(np.arange(len(model.rows)))
    noise = np.sqrt(model.noise.diagonal())
    draws = rng.standard_normal((RUNS, noise.size)) * noise
    draws[:, row] += bias
    w = draws @ columns[:, row] / np.sqrt(reliability.sharpness[row])
    found = np.mean(np.abs(w) > critical_residual(0.001))
    assert found == pytest.approx(0.80, abs=3 * np.sqrt(0.8 * 0.2 / RUNS))
    draws[:, row] -= bias
    every = draws @ columns / np.sqrt(np.maximum(reliability.sharpness, 1e-300))
    every = every[:, reliability.controlled]
    alarms = np.mean(np.abs(every) > critical_residual(0.001))
    assert alarms == pytest.approx(0.001, abs=3 * np.sqrt(0.001 / every.size) + 2e-4)


def test_residuals_of_drawn_nets_are_standardised():
    rng = np.random.default_rng(2)
    values = []
    for _ in range(200):
        model, _ = grid_net(rng)
        values.append(reliability_of(adjust_network(model)).standardised)
    w = np.array(values)[:, 1:]
    assert np.std(w) == pytest.approx(1.0, abs=0.03)


def test_redundancy_adds_up_and_effects_follow_the_bias(rng):
    model, _ = grid_net(rng)
    adjustment = adjust_network(model)
    reliability = reliability_of(adjustment)
    assert reliability.redundancy.sum() == pytest.approx(adjustment.fit.degrees_of_freedom)
    rows = np.array([3, 7])
    effect = reliability.effect_of_bias(rows, np.array([0.5, -0.2]))
    for place, (row, bias) in enumerate(zip(rows, (0.5, -0.2), strict=True)):
        moved = grid_net(np.random.default_rng(20270301), blunders={row - 1: bias})[0]
        difference = adjust_network(moved).estimate - adjustment.estimate
        np.testing.assert_allclose(effect[:, place], difference, atol=1e-12)


def test_one_blunder_is_named(rng):
    model, names = grid_net(rng, blunders={7: 0.09})
    search = find_blunders(reliability_of(adjust_network(model)))
    assert [one.row for one in search.suspects] == [names[7]]
    assert search.suspects[0].bias == pytest.approx(0.09, abs=0.05)
    assert search.p_value > 0.001


def test_two_blunders_that_hide_each_other_are_found_or_the_loop_is_named(rng):
    """Equal errors on two lines of one loop, of opposite sense: the loop itself closes."""
    model, names = grid_net(rng, blunders={9: 0.08, 10: 0.08})
    assert names[9:11] == ["p1.1-p1.2", "p1.1-p2.1"]
    search = find_blunders(reliability_of(adjust_network(model)))
    named = {one.row for one in search.suspects}
    named |= {other for one in search.suspects for other in one.alternatives}
    assert {names[9], names[10]} <= named


@pytest.mark.parametrize(("bias", "least"), [(0.08, 0.75), (0.12, 0.97)])
def test_pairs_that_hide_each_other_are_named_in_most_draws(bias, least):
    """8 u is close to what one of the two may be and stay hidden; 12 u is not."""
    runs, named = 60, 0
    for seed in range(runs):
        model, names = grid_net(np.random.default_rng(seed), blunders={9: bias, 10: bias})
        suspects = find_blunders(reliability_of(adjust_network(model))).suspects
        told = {one.row for one in suspects} | {o for one in suspects for o in one.alternatives}
        named += {names[9], names[10]} <= told
    assert named / runs >= least


def test_a_tie_observed_once_is_uncontrolled():
    lines = [
        ("a", "b", 1.0, 0.01),
        ("b", "c", 1.0, 0.01),
        ("c", "a", -2.0, 0.01),
        ("c", "d", 5.0, 0.01),
    ]
    model = level_net({"a": (0.0, 0.0)}, lines)
    reliability = reliability_of(adjust_network(model))
    tie = model.rows.index("c-d")
    assert not reliability.controlled[tie]
    assert np.isinf(reliability.minimal_detectable_bias[tie])
    assert np.isnan(reliability.standardised[tie])


def test_loops_close_as_their_lines_add_up():
    lines = [("a", "b", 1.0, 0.01), ("b", "c", 1.0, 0.02), ("a", "c", 2.05, 0.02)]
    loops = loop_misclosures(level_net({"a": (0.0, 0.0)}, lines))
    assert len(loops) == 1
    assert abs(loops[0].misclosure) == pytest.approx(0.05, abs=1e-12)
    assert loops[0].u == pytest.approx(0.03, abs=1e-12)  # root of 1 + 4 + 4 in units of 0.01


def test_loops_of_a_grid_are_its_faces_and_dead_ends_close_nothing():
    model, _ = grid_net(np.random.default_rng(9), size=4)
    # Euler: a grid of 4 by 4 points has 9 faces, each the shortest loop of its four sides.
    loops = loop_misclosures(model)
    assert [len(loop.rows) for loop in loops] == [4] * 9
    value = dict(zip(model.rows, model.values, strict=True))
    for loop in loops:
        total = sum(sign * value[row] for row, sign in zip(loop.rows, loop.signs, strict=True))
        assert loop.misclosure == pytest.approx(total, abs=1e-15)
        assert loop.u == pytest.approx(0.02, abs=1e-12)  # four lines of 0.01
    lines = [("a", "b", 1.0, 0.01), ("b", "c", 1.0, 0.01), ("c", "d", 1.0, 0.01)]
    assert loop_misclosures(level_net({"a": (0.0, 0.0)}, lines)) == []


def test_a_suspect_in_one_net_is_not_excused_by_lines_of_another():
    """Two nets without a line between them: only rows of the same loops can be mistaken for it."""
    rng = np.random.default_rng(3)
    one = [
        (f"{part}{i}{j}", f"{part}{end[0]}{end[1]}", 0.01 * rng.standard_normal(), 0.01)
        for part in "lr"
        for i in range(4)
        for j in range(4)
        for end in ((i, j + 1), (i + 1, j))
        if max(end) < 4
    ]
    names = [f"{a}-{b}" for a, b, _, _ in one]
    for row in ("l11-l12", "r21-r22"):
        place = names.index(row)
        start, end, value, u = one[place]
        one[place] = (start, end, value + 0.07, u)
    model = level_net({"l00": (0.0, 0.0), "r00": (0.0, 0.0)}, one)
    suspects = find_blunders(reliability_of(adjust_network(model)), alpha=0.05).suspects
    assert {"l11-l12", "r21-r22"} <= {suspect.row for suspect in suspects}
    for suspect in suspects:
        assert all(other[0] == suspect.row[0] for other in suspect.alternatives)


@pytest.mark.parametrize("rule", ["huber", "igg3"])
def test_the_robust_net_forgets_a_blunder(rule, rng):
    clean, names = grid_net(np.random.default_rng(20270301))
    spoilt, _ = grid_net(rng, blunders={7: 1.0})
    robust = adjust_robustly(spoilt, rule=rule)
    truth, plain = adjust_network(clean), adjust_network(spoilt)
    error = np.max(np.abs(robust.adjustment.estimate - truth.estimate))
    assert error < 0.2 * np.max(np.abs(plain.estimate - truth.estimate))
    factors = dict(zip(spoilt.rows, robust.factors, strict=True))
    assert min(factors, key=factors.get) == names[7]


def test_sparse_and_dense_agree_on_two_thousand_points():
    rng = np.random.default_rng(4)
    model, _ = grid_net(rng, size=45)
    assert len(model.unknowns) == 2025
    dense, sparse = (adjust_network(model, method=method) for method in ("dense", "sparse"))
    scale = dense.u_of_unknowns[1:]
    np.testing.assert_allclose(sparse.u_of_unknowns[1:], scale, rtol=1e-8)
    np.testing.assert_allclose((sparse.estimate - dense.estimate)[1:] / scale, 0.0, atol=1e-8)
    corner = {NumberOf("p44.44"): 1.0, NumberOf("p0.44"): -1.0}
    assert sparse.u(corner) == pytest.approx(dense.u(corner), rel=1e-8)
