"""Variance components against a published analysis, by simulation, and their refusals."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.network.variance_components import Component, variance_components
from small_nets import level_net

# Yield of dyestuff of six batches (Davies 1947; Box and Tiao 1973; data from memory).
DYESTUFF = (
    (1545, 1440, 1440, 1520, 1580),
    (1540, 1555, 1490, 1560, 1495),
    (1595, 1550, 1605, 1510, 1560),
    (1445, 1440, 1595, 1465, 1545),
    (1595, 1630, 1515, 1635, 1625),
    (1520, 1455, 1450, 1480, 1445),
)
NONE = np.array([], dtype=np.int64)


def test_the_batches_of_dyestuff():
    """Published REML estimates: 1764.05 between batches, 2451.25 within."""
    builder = ModelBuilder()
    for batch, yields in enumerate(DYESTUFF):
        for place, value in enumerate(yields):
            builder.observe(
                f"{batch}.{place}",
                kind="yield",
                value=float(value),
                on={"mean": 1.0},
                effects={f"batch {batch}": np.sqrt(1000.0)},
                variance=1000.0,
            )
    components = [
        Component("within", np.arange(30), NONE),
        Component("between", NONE, np.arange(6)),
    ]
    within, between = variance_components(builder.build(), components)
    assert_close(1000.0 * within.factor, 2451.25, tolerance=5e-3, name="within")
    assert_close(1000.0 * between.factor, 1764.05, tolerance=5e-3, name="between")
    # Standard deviations of the estimates, recomputed by iterated least squares.
    assert_close(1000.0 * within.u, 707.61, tolerance=0.05, name="u within")
    assert_close(1000.0 * between.u, 1432.75, tolerance=0.05, name="u between")


def test_no_component_falls_below_zero():
    """Batches that scatter less than their members: the estimate stays at zero."""
    builder = ModelBuilder()
    for batch in range(4):
        for place, value in enumerate((-1.0, 1.0, -1.0, 1.0)):
            builder.observe(
                f"{batch}.{place}",
                kind="yield",
                value=value,
                on={"mean": 1.0},
                effects={f"batch {batch}": 1.0},
                variance=1.0,
            )
    components = [
        Component("within", np.arange(16), NONE),
        Component("between", NONE, np.arange(4)),
    ]
    within, between = variance_components(builder.build(), components)
    assert between.at_zero
    assert between.factor == 0.0
    assert within.factor == pytest.approx(16.0 / 15.0, rel=1e-4)


def test_estimates_of_drawn_nets_scatter_about_the_truth():
    rng = np.random.default_rng(6)
    found = []
    for _ in range(60):
        lines = []
        for place in range(40):
            good, spread = place < 20, (0.02 if place < 20 else 0.06)
            a, b = rng.choice(8, 2, replace=False)
            stated = 0.02 if good else 0.03
            lines.append((f"p{a}", f"p{b}", spread * rng.standard_normal(), stated))
        model = _net(lines)
        groups = [
            Component("good", np.arange(1, 21), NONE),
            Component("poor", np.arange(21, 41), NONE),
        ]
        found.append([(one.factor, one.u) for one in variance_components(model, groups)])
    factors = np.array(found)[:, :, 0]
    spread = np.array(found)[:, :, 1].mean(axis=0)
    for group, true in enumerate((1.0, 4.0)):
        error = factors[:, group].mean() - true
        assert abs(error) < 3.5 * factors[:, group].std() / np.sqrt(60)
    # The stated u is the scatter, to the 9 % that 60 draws know it.
    np.testing.assert_allclose(factors.std(axis=0), spread, rtol=0.35)


def _net(lines):
    builder = ModelBuilder()
    builder.observe("known", kind="known", value=0.0, on={"p0": 1.0}, variance=1e-8)
    for place, (a, b, value, u) in enumerate(lines):
        on = {b: 1.0, a: -1.0}
        builder.observe(f"line {place}", kind="levelled", value=value, on=on, variance=u**2)
    return builder.build()


def test_groups_that_say_nothing_are_refused():
    model = level_net({"a": (0.0, 0.01)}, [("a", "b", 1.0, 0.01)])
    with pytest.raises(DataError, match="a group for variance components is empty: nobody"):
        variance_components(model, [Component("nobody", NONE, NONE)])
    with pytest.raises(DataError, match="no redundancy to estimate its variance from: lines"):
        variance_components(model, [Component("lines", np.array([1]), NONE)])
