"""Excess scatter: never below zero, its interval, and intervals that hold the truth."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from clockgeo.errors import DataError
from clockgeo.frequency.scatter import excess_scatter


def design(size):
    """Sessions at two sites in turn: a level and a difference."""
    columns = np.ones((size, 2))
    columns[::2, 1] = 0.0
    return columns


def test_values_that_agree_too_well_have_no_excess():
    """u must not shrink: four equal values keep the u that was stated."""
    found = excess_scatter([1.0, 1.0, 1.0, 1.0], np.eye(4))
    assert found.standard_deviation == found.lower == 0.0
    assert found.birge_ratio == pytest.approx(0.0)
    assert found.upper > 0.0


def test_equal_u_gives_the_textbook_estimate():
    """With equal internal variances REML is the sample variance less the internal one."""
    values = np.array([-3.0, 1.0, 4.0, -2.0, 5.0])
    found = excess_scatter(values, 2.0 * np.eye(5))
    assert found.standard_deviation**2 == pytest.approx(np.var(values, ddof=1) - 2.0, rel=1e-5)
    chi = float(np.sum((values - values.mean()) ** 2) / 2.0)
    assert found.birge_ratio == pytest.approx(np.sqrt(chi / 4.0))
    assert found.p_value == pytest.approx(stats.chi2.sf(chi, 4))
    assert found.lower < found.standard_deviation < found.upper


def test_against_a_search_of_the_restricted_likelihood(rng):
    """Independent second route: the likelihood as a density of contrasts, searched on a grid."""
    mixing = rng.standard_normal((6, 6))
    covariance = mixing @ mixing.T + np.eye(6)
    values = 3.0 * rng.standard_normal(6)
    found = excess_scatter(values, covariance, design(6))
    contrasts = np.linalg.svd(design(6).T)[2][2:]
    grid = np.linspace(0.0, 20.0, 20_001)
    seen = contrasts @ values
    logs = [
        stats.multivariate_normal.logpdf(
            seen, cov=contrasts @ (covariance + s**2 * np.eye(6)) @ contrasts.T
        )
        for s in grid[::40]
    ]
    near = grid[::40][int(np.argmax(logs))]
    assert found.standard_deviation == pytest.approx(near, abs=0.04)


@pytest.mark.parametrize("size", [4, 5, 8])
@pytest.mark.parametrize("excess", [0.0, 1.0, 1.5, 3.0])
def test_the_interval_holds_the_truth(size, excess):
    """95 % interval of a difference of sites, internal u 1; 500 drawings."""
    rng = np.random.default_rng(100 * size + int(10 * excess))
    columns, held, runs = design(size), 0, 500
    for _ in range(runs):
        values = rng.standard_normal(size) * np.sqrt(1.0 + excess**2)
        found = excess_scatter(values, np.eye(size), columns)
        weight = np.linalg.inv(np.eye(size) * (1.0 + found.standard_deviation**2))
        cofactor = np.linalg.inv(columns.T @ weight @ columns)
        estimate = (cofactor @ columns.T @ weight @ values)[1]
        k = stats.t.ppf(0.975, found.effective_freedom)
        held += abs(estimate) < k * np.sqrt(cofactor[1, 1])
    share, slack = held / runs, 3.0 * np.sqrt(0.95 * 0.05 / runs)
    assert 0.935 - slack < share
    # Where nothing is there to be found, few values cannot say so: the interval is wider.
    assert share < (1.0 if excess == 0.0 else 0.98 + slack)


def test_one_value_says_nothing_of_scatter():
    found = excess_scatter([1.0], np.eye(1))
    assert (found.standard_deviation, found.degrees_of_freedom) == (0.0, 0)
    assert np.isinf(found.effective_freedom)
    assert np.isinf(found.upper)


def test_bad_input_is_refused():
    with pytest.raises(DataError, match="do not fit together"):
        excess_scatter([1.0, 2.0], np.eye(3))
    with pytest.raises(DataError, match="not positive definite"):
        excess_scatter([1.0, 2.0, 4.0], np.array([[1.0, 2, 0], [2, 1, 0], [0, 0, 1]]))


def test_offsets_of_groups_against_a_search_of_the_likelihood(rng):
    """Second route for shared offsets: three configurations of three sessions each."""
    groups = np.kron(np.eye(3), np.ones((3, 3)))
    values = 0.5 * rng.standard_normal(9) + np.repeat(4.0 * rng.standard_normal(3), 3)
    found = excess_scatter(values, 0.25 * np.eye(9), sharing=groups)
    assert found.degrees_of_freedom == 2
    contrasts = np.linalg.svd(np.ones((1, 9)))[2][1:]
    seen = contrasts @ values
    grid = np.linspace(0.0, 30.0, 3001)
    logs = [
        stats.multivariate_normal.logpdf(
            seen, cov=contrasts @ (0.25 * np.eye(9) + s**2 * groups) @ contrasts.T
        )
        for s in grid
    ]
    assert found.standard_deviation == pytest.approx(grid[int(np.argmax(logs))], abs=0.011)


def test_scatter_of_groups_is_the_textbook_one():
    """Balanced groups: variance of the group means less what their values bring in."""
    values = np.array([5.0, 7.0, -4.0, -2.0, 1.0, 3.0])
    groups = np.kron(np.eye(3), np.ones((2, 2)))
    found = excess_scatter(values, np.eye(6), sharing=groups)
    assert found.standard_deviation**2 == pytest.approx(
        np.var([6.0, -3.0, 2.0], ddof=1) - 0.5, rel=1e-5
    )


def test_singular_covariances_are_refused():
    with pytest.raises(DataError, match="not positive definite"):
        excess_scatter([1.0, 2.0, 3.0], np.ones((3, 3)))
