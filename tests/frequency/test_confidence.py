"""Equivalent degrees of freedom and chi-squared intervals against exact and published values."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.frequency.confidence import chi_squared_interval, freedom_of
from clockgeo.frequency.contrasts import equivalent_freedom
from clockgeo.frequency.stability_statistics import find_statistic


def freedom(statistic, alpha, m, phases):
    return freedom_of(find_statistic(statistic), alpha, m, phases - 1)


# 2 E²/Var from the exact covariance of sampled power-law phase (white samples, their sum, their
# double sum), computed apart from this project: statistic, alpha, m, phases, edf.
EXACT = [
    ("overlapping-allan", 2, 1, 1001, "514.0361"),
    ("overlapping-allan", 2, 10, 1001, "507.1731"),
    ("overlapping-allan", 2, 100, 1001, "440.2065"),
    ("overlapping-allan", 2, 2, 10, "3.7241"),
    ("overlapping-allan", 0, 1, 1001, "666.2223"),
    ("overlapping-allan", 0, 10, 1001, "146.0723"),
    ("overlapping-allan", 0, 100, 1001, "12.8133"),
    ("overlapping-allan", 0, 2, 10, "4.0000"),
    ("overlapping-allan", 0, 4, 101, "33.0272"),
    ("overlapping-allan", 0, 16, 65, "4.0601"),
    ("overlapping-allan", 0, 1, 513, "340.889"),
    ("overlapping-allan", 0, 8, 513, "92.135"),
    ("overlapping-allan", 0, 64, 513, "9.838"),
    ("allan", 0, 10, 1001, "66.2230"),
    ("allan", 0, 100, 1001, "6.2308"),
    ("modified-allan", 2, 10, 1001, "123.9402"),
    ("overlapping-hadamard", 2, 10, 1001, "423.1763"),
    ("overlapping-hadamard", 0, 10, 1001, "123.8136"),
]
# The same where the published algorithm approximates: phase is thought continuous.
NEARLY = [
    ("overlapping-allan", -2, 10, 1001, 91.7548),
    ("overlapping-allan", -2, 16, 65, 2.2944),
    ("modified-allan", 0, 10, 1001, 95.1093),
    ("modified-allan", 0, 100, 1001, 7.4144),
    ("modified-allan", -2, 10, 1001, 75.2837),
    ("overlapping-hadamard", -2, 10, 1001, 95.0121),
    ("overlapping-hadamard", -4, 10, 1001, 75.2066),
]
# Greenhall and Riley 2003 evaluated apart from this project (method from memory).
PUBLISHED = [
    ("overlapping-allan", 1, 10, 1001, "247.3068"),
    ("modified-allan", 1, 10, 1001, "98.1165"),
    ("modified-allan", 0, 10, 1001, "94.6343"),
    ("modified-allan", -1, 10, 1001, "93.2730"),
    ("modified-allan", -2, 10, 1001, "74.9571"),
]


@pytest.mark.parametrize(("statistic", "alpha", "m", "phases", "edf"), EXACT + PUBLISHED)
def test_freedom_as_computed_elsewhere(statistic, alpha, m, phases, edf):
    assert_published(freedom(statistic, alpha, m, phases), edf)


@pytest.mark.parametrize(("statistic", "alpha", "m", "phases", "edf"), NEARLY)
def test_freedom_within_a_hundredth_of_the_exact_one(statistic, alpha, m, phases, edf):
    assert_close(freedom(statistic, alpha, m, phases), edf, tolerance=0.01 * edf)


def test_flicker_between_its_neighbours():
    # No exact value is at hand for the flicker laws: they lie between the laws beside them.
    for m in (2, 4, 16, 64):
        white, flicker, walk = (freedom("overlapping-allan", a, m, 1001) for a in (0, -1, -2))
        assert walk < flicker < white
        assert freedom("modified-allan", -2, m, 1001) < freedom("modified-allan", -1, m, 1001)


# edf = b T/tau - c of total and modified total, (T/tau)/(b0 + b1 tau/T) of Hadamard total; NIST SP
# 1065 (from memory). SP 1065 prints 150.000 for the total deviation of 1000 points at factor 10.
TOTAL = [
    ("total", 0, "150.000"),
    ("total", -2, "92.64"),
    ("modified-total", 2, "187.9"),
    ("modified-total", 0, "108.8"),
    ("time-total", -2, "74.69"),
    ("hadamard-total", 0, "175.73"),
]


@pytest.mark.parametrize(("statistic", "alpha", "edf"), TOTAL)
def test_freedom_of_the_total_family(statistic, alpha, edf):
    assert_published(freedom(statistic, alpha, 10, 1001), edf)


def test_modified_is_plain_without_averaging():
    for alpha in (2, 1, 0, -1, -2):
        plain = freedom("overlapping-allan", alpha, 1, 501)
        assert freedom("modified-allan", alpha, 1, 501) == plain


def test_quadratic_form_gives_the_exact_freedom():
    # White FM, 512 samples, overlapped: 340.889, 92.135, 9.838 at m = 1, 8, 64; computed apart.
    for m, edf in ((1, "340.889"), (8, "92.135"), (64, "9.838")):
        rows = np.zeros((512 - 2 * m + 1, 512))
        for start, row in enumerate(rows):
            row[start : start + m] = -1.0
            row[start + m : start + 2 * m] = 1.0
        assert_published(equivalent_freedom(rows, np.eye(512)), edf)


def test_interval_of_the_thousand_points():
    # SP 1065 (from memory) prints 8.223942e-02 and 1.035201e-01 at 95 % for the overlapping Allan
    # deviation 9.159953e-02, with edf 146.177 and chi-squared of the truncated 146.
    lower, upper = chi_squared_interval(9.159953e-02, 146.177, 0.95)
    assert_close(lower, 8.223942e-02, tolerance=1e-3 * lower)
    assert_close(upper, 1.035201e-01, tolerance=1e-3 * upper)
    # Not truncated: 8.219489e-02 and 1.034536e-01, recomputed with tables of chi-squared.
    assert_published(lower * 1e2, "8.219489")
    assert_published(upper * 10, "1.034536")


def test_intervals_cover_as_often_as_they_say(rng):
    # Squares of k normal draws follow chi-squared with k degrees of freedom by definition.
    for freedom_ in (2, 20):
        squares = np.sum(rng.standard_normal((4_000, freedom_)) ** 2, axis=1)
        ends = [chi_squared_interval(np.sqrt(s / freedom_), freedom_, 0.8) for s in squares[:1_000]]
        covered = np.mean([low < 1.0 < high for low, high in ends])
        assert_close(covered, 0.8, tolerance=0.04)  # three standard deviations


@pytest.mark.parametrize("level", [0.0, 1.0, -0.5, 95.0, np.nan])
def test_a_level_that_is_no_probability_is_refused(level):
    with pytest.raises(DataError, match="confidence level lies between 0 and 1"):
        chi_squared_interval(1.0, 10.0, level)
