"""The linear model and its solution: shared effects, rank, redundancy, identities."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.solution import solve

UNIT = 1.0


def three_clocks(pairs):
    """Clocks with u = 5, 3, 2, of which 1.5 is common to the species; ratios as observations."""
    own = {name: np.sqrt(u**2 - 1.5**2) for name, u in {"a": 5.0, "b": 3.0, "c": 2.0}.items()}
    builder = ModelBuilder()
    for n, d in pairs:
        builder.observe(
            f"{n}/{d}",
            kind="clock",
            value=0.0,
            on={f"C{n}": 1.0, f"C{d}": -1.0} if d != "a" else {f"C{n}": 1.0},
            effects={n: own[n], d: -own[d], "species": 0.0},
        )
    return builder.build()


# Identity: the common part cancels, u(A/B) = sqrt(25 + 9 - 2 * 1.5^2) * 1 and so on by hand.
@pytest.mark.parametrize(
    ("first", "second", "printed"),
    [("a/b", "a/c", "0.846228"), ("a/b", "b/c", "-0.426269"), ("a/c", "b/c", "0.121268")],
)
def test_ratios_of_three_clocks_correlate_through_the_clocks(first, second, printed):
    model = three_clocks([("a", "b"), ("a", "c"), ("b", "c")])
    V = model.covariance()
    place = {row: i for i, row in enumerate(model.rows)}
    i, j = place[first], place[second]
    assert_published(V[i, j] / np.sqrt(V[i, i] * V[j, j]), printed)


@pytest.mark.parametrize(
    ("pair", "printed"), [("a/b", "5.43139"), ("a/c", "4.94975"), ("b/c", "2.91548")]
)
def test_ratio_uncertainties_leave_out_the_common_part(pair, printed):
    model = three_clocks([("a", "b"), ("a", "c"), ("b", "c")])
    place = model.rows.index(pair)
    assert_published(np.sqrt(model.covariance()[place, place]), printed)


def test_three_ratios_have_rank_two_and_the_third_lowers_no_u():
    three = three_clocks([("b", "a"), ("c", "a"), ("c", "b")])
    two = three_clocks([("b", "a"), ("c", "a")])
    assert np.linalg.matrix_rank(three.covariance()) == 2
    full, part = solve(three), solve(two)
    for name in ("Cb", "Cc"):
        assert_close(full.u({name: 1.0}), part.u({name: 1.0}), tolerance=1e-9)
    assert full.fit.degrees_of_freedom == 0


def test_against_ordinary_least_squares(rng):
    A = rng.normal(size=(8, 3))
    values, sigma = rng.normal(size=8), rng.uniform(0.5, 2.0, size=8)
    builder = ModelBuilder()
    for i in range(8):
        on = {f"x{j}": A[i, j] for j in range(3)}
        builder.observe(f"l{i}", kind="any", value=values[i], on=on, variance=sigma[i] ** 2)
    solution = solve(builder.build())
    expected, *_ = np.linalg.lstsq(A / sigma[:, None], values / sigma, rcond=None)
    np.testing.assert_allclose(solution.estimate, expected, rtol=1e-10)
    np.testing.assert_allclose(
        solution.covariance, np.linalg.inv(A.T @ (A / sigma[:, None] ** 2)), rtol=1e-9
    )
    chi = np.sum(((values - A @ expected) / sigma) ** 2)
    assert_close(solution.fit.chi_squared, chi, tolerance=1e-9)
    assert solution.fit.degrees_of_freedom == 5


def test_effects_as_covariance_equal_effects_as_unknowns_with_a_prior(rng):
    """Two routes to the same solution: V = N + L Lᵀ, or z as unknowns observed as 0 +- 1."""
    A, L = rng.normal(size=(9, 2)), rng.normal(size=(9, 4))
    values = rng.normal(size=9)
    one, other = ModelBuilder(), ModelBuilder()
    for i in range(9):
        on = {f"x{j}": A[i, j] for j in range(2)}
        loads = {f"z{k}": L[i, k] for k in range(4)}
        one.observe(f"l{i}", kind="any", value=values[i], on=on, effects=loads, variance=0.3)
        other.observe(f"l{i}", kind="any", value=values[i], on=on | loads, variance=0.3)
    for k in range(4):
        other.observe(f"prior{k}", kind="prior", value=0.0, on={f"z{k}": 1.0}, variance=1.0)
    first, second = solve(one.build()), solve(other.build())
    for name in ("x0", "x1"):
        assert_close(first.value({name: 1}), second.value({name: 1}), tolerance=1e-9)
        assert_close(first.u({name: 1}), second.u({name: 1}), tolerance=1e-9)
    assert_close(first.fit.chi_squared, second.fit.chi_squared, tolerance=1e-9)


def test_contributions_and_noise_add_up_to_u(rng):
    builder = ModelBuilder()
    for i in range(5):
        builder.observe(
            f"l{i}",
            kind="clock",
            value=1.0,
            on={"x": 1.0},
            effects={"common": 0.4, f"own{i}": 0.2},
            variance=0.1 * (i + 1),
        )
    solution = solve(builder.build())
    parts = [c.u for c in solution.contributions({"x": 1.0})]
    total = np.sqrt(np.sum(np.square(parts)) + solution.noise_u({"x": 1.0}) ** 2)
    assert_close(total, solution.u({"x": 1.0}), tolerance=1e-12)
    assert_close(parts[0], 0.4, tolerance=1e-12)


def test_unknowns_without_connection_are_named():
    builder = ModelBuilder()
    builder.observe("one", kind="clock", value=0.0, on={"x": 1.0, "y": -1.0}, variance=1.0)
    with pytest.raises(DataError, match=r"do not determine all unknowns: x, y"):
        solve(builder.build())


def test_contradicting_copies_are_refused():
    builder = ModelBuilder()
    for row, value in (("one", 0.0), ("two", 1.0)):
        builder.observe(row, kind="clock", value=value, on={"x": 1.0}, effects={"z": 1.0})
    with pytest.raises(DataError, match=r"contradict each other: misfit"):
        solve(builder.build())


def test_equal_copies_count_once():
    builder = ModelBuilder()
    for row in ("one", "two"):
        builder.observe(row, kind="clock", value=2.0, on={"x": 1.0}, effects={"z": 1.0})
    solution = solve(builder.build())
    assert_close(solution.u({"x": 1.0}), 1.0, tolerance=1e-9)
    assert solution.fit.degrees_of_freedom == 0


@pytest.mark.parametrize(
    ("value", "variance"), [(np.nan, 1.0), (0.0, -1.0), (np.inf, 1.0)], ids=str
)
def test_bad_numbers_are_refused(value, variance):
    with pytest.raises(DataError, match=r"not finite, or a negative variance.*observation one"):
        ModelBuilder().observe("one", kind="clock", value=value, on={"x": 1.0}, variance=variance)


def test_an_id_is_used_once():
    builder = ModelBuilder()
    builder.observe("one", kind="clock", value=0.0, on={"x": 1.0})
    with pytest.raises(DataError, match=r"used twice: one"):
        builder.observe("one", kind="clock", value=0.0, on={"x": 1.0})


def test_a_covariance_block_must_fit_its_rows():
    builder = ModelBuilder()
    builder.observe("one", kind="clock", value=0.0, on={"x": 1.0})
    with pytest.raises(DataError, match=r"does not fit its rows: shape \(2, 2\)"):
        builder.correlate(["one"], np.eye(2))
