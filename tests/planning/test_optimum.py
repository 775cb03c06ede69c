"""Optimal designs against published and independent values, and the honesty of their bounds."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import minimize

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.planning.design_problem import DesignProblem, State
from clockgeo.planning.optimum import optimise

EDGES = [(0, 1), (1, 2), (2, 3), (3, 4), (4, 0), (0, 2), (1, 3)]
CRITERIA = ["worst", "A", "D", "E"]


def graph(criterion, **more):
    """Five nodes, node 0 fixed, seven differences of equal variance, one unit of time."""
    rows = np.zeros((len(EDGES), 5))
    for k, (i, j) in enumerate(EDGES):
        rows[k, i], rows[k, j] = -1.0, 1.0
    return DesignProblem.of(rows[:, 1:], np.ones(len(EDGES)), np.eye(4), criterion, **more)


# Computed by the multiplicative algorithms of Kiefer and Wolfowitz (D) and for A, to the digits
# shown (digest of estimation methods, section 4.13).
D_WEIGHTS = [".133796", ".116204", ".133796", ".174306", ".174306", ".133796", ".133796"]
A_WEIGHTS = [".212680", ".023908", ".105078", ".115238", ".225339", ".212680", ".105078"]


def test_d_design_of_the_graph():
    found = optimise(graph("D"), gap=1e-10)
    assert found.gap < 1e-8
    for weight, printed in zip(found.w, D_WEIGHTS, strict=True):
        assert_published(weight, printed, units=1.0)  # the source may have cut the last digit
    assert_published(-found.value, "-4.575058")


def test_a_design_of_the_graph():
    found = optimise(graph("A"), gap=1e-10)
    assert found.gap < 1e-8
    for weight, printed in zip(found.w, A_WEIGHTS, strict=True):
        assert_published(weight, printed, units=1.0)
    assert_published(found.value, "14.965086", units=1.0)


def test_the_d_design_fulfils_the_equivalence_theorem():
    # Kiefer and Wolfowitz 1960: g_i = a_i' M^-1 a_i <= p, with equality where there is weight.
    problem = graph("D")
    found = optimise(problem, gap=1e-11)
    leverage = np.diag(State(problem, found.w).between())
    assert leverage.max() == pytest.approx(4.0, abs=1e-6)
    assert np.allclose(leverage[found.w > 1e-3], 4.0, atol=1e-5)


def test_star():
    # Weights go as the root of variance times cost weight: (1, 1, 4, 9) gives 1, 1, 2, 3 of 7.
    problem = DesignProblem.of(np.eye(4), 1.0 / np.array([1.0, 1.0, 4.0, 9.0]), np.eye(4), "A")
    found = optimise(problem, gap=1e-10)
    assert found.gap < 1e-8
    np.testing.assert_allclose(found.w, np.array([1.0, 1.0, 2.0, 3.0]) / 7.0, atol=1e-6)
    assert_close(found.value, 49.0, tolerance=1e-6)
    assert_close(problem.value(np.full(4, 0.25)), 60.0, tolerance=1e-9)


def floors():
    """Two links with floors 1e-18 and 3e-18, 5e-16 and 2e-16 at 1 s, in units of 1e-18 and days."""
    variance = np.array([500.0, 200.0]) ** 2 / 86_400.0
    rows = np.array([[1.0, 1.0, 0.0], [1.0, 0.0, 3.0]])
    known = np.diag([0.0, 1.0, 1.0])
    wanted = np.array([[1.0], [0.0], [0.0]])
    return DesignProblem.of(rows, 1.0 / variance, wanted, "A", budget=5.0, known=known)


def test_floors():
    problem = floors()
    found = optimise(problem, gap=1e-10)
    assert found.gap < 1e-8
    assert_published(100.0 * found.w[0] / 5.0, "94.267")
    assert_published(found.value**0.5, "1.18360")
    assert_published(problem.value(np.array([2.5, 2.5])) ** 0.5, "1.3218")
    rule = np.array([1.0 / 500.0**2, 1.0 / 200.0**2])
    assert_published(problem.value(5.0 * rule / rule.sum()) ** 0.5, "1.8189")


def test_e_design_against_a_general_solver():
    problem = graph("E")
    found = optimise(problem, gap=1e-9)

    def largest(w):
        return State(problem, np.abs(w) / np.sum(np.abs(w))).value

    tries = [
        minimize(largest, start, method="Nelder-Mead", options={"maxiter": 8000, "fatol": 1e-9})
        for start in (np.full(7, 1 / 7), found.w + 0.01)
    ]
    assert found.value <= min(one.fun for one in tries) + 1e-7
    assert_close(found.value, 7.0, tolerance=1e-6)  # what the general solver tends to


def test_worst_of_two_is_evened_out():
    # Two independent differences with variances 1 and 4: times 1 to 4 make both equal.
    problem = DesignProblem.of(np.eye(2), np.array([1.0, 0.25]), np.eye(2), "worst")
    found = optimise(problem, gap=1e-9)
    np.testing.assert_allclose(found.w, [0.2, 0.8], atol=1e-6)


@pytest.mark.parametrize("criterion", CRITERIA)
def test_no_feasible_allocation_beats_the_bound(criterion, rng):
    cost = rng.uniform(0.5, 2.0, 7)
    problem = graph(criterion, cost=cost, budget=3.0, least=np.full(7, 0.05), most=np.full(7, 0.9))
    found = optimise(problem, gap=1e-9)
    assert 0.0 <= found.gap < 1e-8
    assert cost @ found.w <= 3.0
    assert np.all((found.w > 0.05) & (found.w < 0.9))
    drawn = rng.dirichlet(np.ones(7), 400) * 3.0 / cost
    feasible = [np.clip(w, 0.05, 0.9) for w in drawn]
    values = [problem.value(w) for w in feasible if cost @ w <= 3.0]
    assert len(values) > 10
    assert min(values) >= found.bound


@pytest.mark.parametrize("criterion", CRITERIA)
def test_slopes_are_those_of_finite_differences(criterion, rng):
    problem = graph(criterion)
    w = rng.uniform(0.1, 0.3, 7)
    state = State(problem, w)
    weights = {
        "A": np.eye(4),
        "D": np.linalg.inv(state.v),
        "E": np.outer(*[np.linalg.eigh(state.v)[1][:, -1]] * 2),
        "worst": np.diag((np.diag(state.v) == np.diag(state.v).max()).astype(float)),
    }[criterion]
    slope = state.weighted_slope(weights)
    for k in range(7):
        step = np.zeros(7)
        step[k] = 1e-6
        numeric = (problem.value(w + step) - problem.value(w - step)) / 2e-6
        assert slope[k] == pytest.approx(numeric, rel=1e-5)


def test_what_leaves_no_room_is_refused():
    with pytest.raises(DataError, match="leave no room"):
        optimise(graph("A", least=np.full(7, 0.2)))
