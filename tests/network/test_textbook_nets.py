"""Levelling nets of textbooks: heights, their u, residuals, redundancy numbers."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_published
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.reliability import reliability_of
from small_nets import level_net

# Ghilani, Adjustment Computations, ch. 12, level net between the benchmarks X = 100.00 ft and
# Y = 107.50 ft; data and printed heights from memory, further digits recomputed from the data.
GHILANI_LINES = (
    ("X", "A", 5.10, 4.0),
    ("A", "Y", 2.34, 3.0),
    ("Y", "C", -1.25, 2.0),
    ("C", "X", -6.13, 3.0),
    ("A", "B", -0.68, 2.0),
    ("B", "Y", 3.00, 2.0),
    ("B", "C", 1.70, 2.0),
)


def ghilani(weighted, method):
    known = {"X": (100.0, 0.0), "Y": (107.5, 0.0)}
    u = [np.sqrt(length / 12.0) if weighted else 1.0 for _, _, _, length in GHILANI_LINES]
    lines = [(a, b, d, s) for (a, b, d, _), s in zip(GHILANI_LINES, u, strict=True)]
    return adjust_network(level_net(known, lines), method=method)


@pytest.mark.parametrize("method", ["dense", "sparse"])
@pytest.mark.parametrize(
    ("weighted", "printed", "factor", "u", "redundancy"),
    [
        (
            False,
            ("105.141", "104.483", "106.188"),
            "0.0501",
            ("0.0309", "0.0328", "0.0309"),
            ("0.6190", "0.6190", "0.6190", "0.6190", "0.4762", "0.5714", "0.4762"),
        ),
        (
            True,
            ("105.150", "104.489", "106.197"),
            "0.1072",
            ("0.0328", "0.0298", "0.0290"),
            ("0.7200", "0.6267", "0.5600", "0.7067", "0.4044", "0.5378", "0.4444"),
        ),
    ],
)
def test_net_between_two_benchmarks(method, weighted, printed, factor, u, redundancy):
    adjustment = ghilani(weighted, method)
    reliability = reliability_of(adjustment)
    s0 = float(np.sqrt(adjustment.fit.chi_squared / adjustment.fit.degrees_of_freedom))
    assert adjustment.fit.degrees_of_freedom == 4
    assert_published(s0, factor)
    for point, height, spread in zip("ABC", printed, u, strict=True):
        assert_published(adjustment.value({NumberOf(point): 1.0}), height)
        assert_published(s0 * adjustment.u({NumberOf(point): 1.0}), spread)
    of_lines = dict(zip(adjustment.model.rows, reliability.redundancy, strict=True))
    for (a, b, _, _), number in zip(GHILANI_LINES, redundancy, strict=True):
        assert_published(of_lines[f"{a}-{b}"], number)
    assert sum(reliability.redundancy) == pytest.approx(4.0, abs=1e-9)


# Ghilani, example 12.1: A = 437.596 m, standard deviations in mm; data and printed heights from
# memory, the other digits recomputed from the data.
EXAMPLE = (
    ("A", "B", 10.509, 6.0, "0.6549", "0.764"),
    ("B", "C", 5.360, 4.0, "0.3294", "-0.106"),
    ("C", "D", -8.523, 5.0, "0.5092", "-0.522"),
    ("D", "A", -7.348, 3.0, "0.1877", "0.304"),
    ("B", "D", -3.167, 4.0, "0.4326", "0.720"),
    ("A", "C", 15.881, 12.0, "0.8862", "-0.755"),
)


def test_weighted_net_with_residuals():
    lines = [(a, b, d, u * 1e-3) for a, b, d, u, _, _ in EXAMPLE]
    adjustment = adjust_network(level_net({"A": (437.596, 0.0)}, lines))
    reliability = reliability_of(adjustment)
    for point, height, u in zip(
        "BCD", ("448.1087", "453.4685", "444.9436"), ("3.525", "4.048", "2.704"), strict=True
    ):
        assert_published(adjustment.value({NumberOf(point): 1.0}), height)
        assert_published(1e3 * adjustment.u({NumberOf(point): 1.0}), u)
    assert adjustment.fit.degrees_of_freedom == 3
    assert_published(adjustment.fit.chi_squared, "1.27212")
    place = {row: i for i, row in enumerate(adjustment.model.rows)}
    for a, b, _, _, redundancy, standardised in EXAMPLE:
        row = place[f"{a}-{b}"]
        assert_published(reliability.redundancy[row], redundancy)
        # The book counts residuals as computed minus observed.
        assert_published(-reliability.standardised[row], standardised)


def test_net_with_three_benchmarks():
    """Strang and Borre, Linear Algebra, Geodesy, and GPS; data and heights from memory."""
    known = {"A": (10.021, 0.0), "B": (10.321, 0.0), "C": (11.002, 0.0)}
    data = (
        ("A", "D", 1.978, 1.02),
        ("A", "E", 0.732, 0.97),
        ("C", "D", 0.988, 1.11),
        ("B", "E", 0.420, 1.07),
        ("E", "D", 1.258, 0.89),
    )
    lines = [(a, b, d, 1e-3 * np.sqrt(length)) for a, b, d, length in data]
    adjustment = adjust_network(level_net(known, lines))
    fit = adjustment.fit
    s0 = float(np.sqrt(fit.chi_squared / fit.degrees_of_freedom))
    assert_published(s0, "7.458")
    assert_published(adjustment.value({NumberOf("D"): 1.0}), "11.9976")
    assert_published(adjustment.value({NumberOf("E"): 1.0}), "10.7445")
    assert_published(s0 * 1e3 * adjustment.u({NumberOf("D"): 1.0}), "4.63")
    assert_published(s0 * 1e3 * adjustment.u({NumberOf("E"): 1.0}), "4.57")
