"""No uncontrolled ties, and whole days."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from clockgeo.errors import DataError
from clockgeo.planning.control import Ties, broken_cuts, optimise_controlled, uncontrolled
from clockgeo.planning.design_problem import DesignProblem
from clockgeo.planning.optimum import optimise
from clockgeo.planning.rounding import round_to_steps


def net(edges, rate, criterion="A", **more):
    nodes = 1 + max(max(pair) for pair in edges)
    rows = np.zeros((len(edges), nodes))
    for k, (i, j) in enumerate(edges):
        rows[k, i], rows[k, j] = -1.0, 1.0
    wanted = np.eye(nodes - 1)
    problem = DesignProblem.of(rows[:, 1:], np.array(rate), wanted, criterion, **more)
    return problem, Ties(np.array(edges), (), nodes)


TRIANGLE = [(0, 1), (1, 2), (0, 2)]


def test_control_changes_the_design():
    problem, ties = net(TRIANGLE, [1.0, 1.0, 0.05])
    free = optimise(problem, gap=1e-10)
    # The third side is poor: the chain of the other two is best, and nothing controls it.
    assert free.w[2] < 1e-6
    assert uncontrolled(ties, np.where(free.w > 1e-6, free.w, 0.0)) == [0, 1]
    found = optimise_controlled(problem, ties, 0.1, gap=1e-10)
    assert uncontrolled(ties, found.w) == []
    # Across every cut of a triangle two sides remain, of which the smaller has its tenth.
    assert found.w[2] / (found.w[0] + found.w[2]) == pytest.approx(0.1, abs=1e-4)
    assert found.value > free.value
    assert found.gap < 1e-8


def test_the_controlled_optimum_against_a_search():
    problem, ties = net(TRIANGLE, [1.0, 1.0, 0.05])
    found = optimise_controlled(problem, ties, 0.1, gap=1e-10)
    grid = np.linspace(0.02, 0.98, 25)
    best = min(
        problem.value(np.array([a, b, 1.0 - a - b]))
        for a, b in product(grid, grid)
        if a + b < 1.0 and next(broken_cuts(ties, np.array([a, b, 1.0 - a - b]), 0.1), None) is None
    )
    assert found.bound <= best
    assert best == pytest.approx(found.value, rel=2e-2)  # as fine as the grid is


def test_a_chain_cannot_be_controlled():
    problem, ties = net([(0, 1), (1, 2)], [1.0, 1.0])
    with pytest.raises(DataError, match="wish for control leave no room"):
        optimise_controlled(problem, ties, 0.1)


def test_data_of_other_kinds_control_too():
    ties = Ties(np.array([(0, 1), (0, 2)]), ((1, 2, np.inf),), 3)
    assert uncontrolled(ties, np.ones(2)) == []
    assert uncontrolled(Ties(ties.ends, (), 3), np.ones(2)) == [0, 1]


def test_sessions_in_one_place_join_nothing():
    ties = Ties(np.array([(0, 0), (0, 1)]), (), 2)
    assert uncontrolled(ties, np.ones(2)) == [1]


@pytest.mark.parametrize("criterion", ["worst", "A", "D", "E"])
def test_whole_steps_against_trying_them_all(criterion):
    problem, _ = net(
        [(0, 1), (1, 2), (2, 3), (3, 0), (0, 2)],
        [1.0, 0.3, 0.6, 0.2, 0.9],
        criterion,
        budget=7.0,
    )
    found = optimise(problem, gap=1e-9)
    whole = round_to_steps(problem, found.w, 1.0)
    assert whole.sum() == 7.0
    assert np.all(whole == np.rint(whole))
    best = min(
        problem.value(np.array(w, dtype=float))
        for w in product(range(8), repeat=5)
        if sum(w) == 7 and np.isfinite(problem.value(np.array(w, dtype=float)))
    )
    assert problem.value(whole) >= best - 1e-12
    assert found.bound <= best
    # Exchanges find the best of all here, but for the plateaus of the largest eigenvalue.
    slack = 0.15 if criterion == "E" else 1e-9
    assert problem.value(whole) <= best + slack * abs(best)


def test_whole_steps_keep_bounds_and_wishes():
    problem, ties = net(TRIANGLE, [1.0, 1.0, 0.05], budget=20.0, least=np.array([0.0, 7.5, 0.0]))
    found = optimise_controlled(problem, ties, 0.1, gap=1e-9)

    def allowed(w):
        return next(broken_cuts(ties, w, 0.1), None) is None

    whole = round_to_steps(problem, found.w, 1.0, allowed=allowed)
    assert whole.sum() == 20.0
    assert whole[1] >= 8.0
    assert allowed(whole)
    assert uncontrolled(ties, whole) == []
