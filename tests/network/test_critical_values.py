"""Sizes and powers of tests against printed tables."""

from __future__ import annotations

import pytest

from checks import assert_published
from clockgeo.errors import DataError
from clockgeo.network.critical_values import (
    critical_residual,
    critical_tau,
    detectable_shift,
    global_limits,
    matched_alpha,
)


@pytest.mark.parametrize(
    ("alpha", "power", "printed"),
    [
        # Baarda 1968: 4.13 (from memory); further digits from the noncentral chi-square.
        (0.001, 0.80, "4.1321"),
        (0.001, 0.95, "4.9354"),
        (0.01, 0.80, "3.4175"),
        (0.05, 0.80, "2.8016"),
        (0.05, 0.90, "3.2415"),
        (0.1, 0.70, "2.1691"),
    ],
)
def test_detectable_shift(alpha, power, printed):
    assert_published(detectable_shift(alpha=alpha, power=power), printed)


@pytest.mark.parametrize(
    ("dimension", "printed"),
    [
        (1, "0.00100"),
        (2, "0.00284"),
        (3, "0.00550"),
        (5, "0.01302"),
        (10, "0.04043"),
        (50, "0.2604"),
    ],
)
def test_sizes_of_one_non_centrality(dimension, printed):
    # Baarda's B-method with non-centrality 17.0746 and power 0.8.
    assert_published(matched_alpha(dimension), printed)


@pytest.mark.parametrize(
    ("alpha", "printed"), [(0.05, "1.9600"), (0.01, "2.5758"), (0.001, "3.2905")]
)
def test_critical_residual(alpha, printed):
    assert_published(critical_residual(alpha), printed)


@pytest.mark.parametrize(
    ("freedom", "printed"),
    [(2, "1.4099"), (3, "1.6454"), (5, "1.8143"), (10, "1.9039"), (50, "1.9512")],
)
def test_tau(freedom, printed):
    # Pope 1976, two-sided 5 %; recomputed from Student's t.
    assert_published(critical_tau(freedom), printed)


@pytest.mark.parametrize(
    ("freedom", "lower", "upper"),
    [
        (1, "0.00098", "5.0239"),
        (5, "0.1662", "2.5665"),
        (20, "0.4795", "1.7085"),
        (100, "0.7422", "1.2956"),
    ],
)
def test_limits_of_the_variance_factor(freedom, lower, upper):
    found = global_limits(freedom)
    assert_published(found[0], lower)
    assert_published(found[1], upper)


def test_shares_must_be_shares():
    with pytest.raises(DataError, match="alpha must lie between 0 and 1"):
        critical_residual(0.0)
    with pytest.raises(DataError, match="the power must be above alpha"):
        detectable_shift(alpha=0.5, power=0.4)
    with pytest.raises(DataError, match="needs a degree of freedom"):
        global_limits(0)
