"""What a net cannot tell is said in words, with infinite u and no number."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.session_rows import NumberOf, add_known_number
from clockgeo.network.adjustment import adjust_network
from clockgeo.network.identifiability import identify
from clockgeo.network.unknowns import DatumTerm
from clockgeo.network.zero_definition import ZeroRule
from small_nets import level_net

TRIANGLE = [("a", "b", 1.0, 0.01), ("b", "c", 2.0, 0.01), ("c", "a", -3.03, 0.01)]


def datum_on(sites):
    """A datum with two tilts, published at sites (north, east in m) of known number zero."""
    builder = ModelBuilder()
    for place, (north, east) in enumerate(sites):
        site = f"s{place}"
        add_known_number(builder, site, 0.0, 0.01)
        on = {
            NumberOf(site): 1.0,
            DatumTerm("B", "offset"): -1.0,
            DatumTerm("B", "tilt_north"): -north,
            DatumTerm("B", "tilt_east"): -east,
        }
        builder.observe(f"B: {site}", kind="published", value=0.1, on=on, variance=1e-4)
    return builder.build()


def test_two_sites_on_a_meridian_leave_the_tilt_east_open():
    model = datum_on([(0.0, 0.0), (50e3, 0.0)])
    gaps = identify(model).gaps
    assert len(gaps) == 1
    assert gaps[0].text == (
        "datum B: tilt east not estimable from two sites on a meridian; "
        "needs one more site off that line"
    )
    adjustment = adjust_network(model)
    assert np.isinf(adjustment.u({DatumTerm("B", "tilt_east"): 1.0}))
    assert np.isnan(adjustment.value({DatumTerm("B", "tilt_east"): 1.0}))
    assert np.isfinite(adjustment.u({DatumTerm("B", "tilt_north"): 1.0}))


def test_two_sites_off_the_axes_leave_a_combination_open():
    gaps = identify(datum_on([(0.0, 0.0), (50e3, 30e3)])).gaps
    assert "tilt north and tilt east not estimable" in gaps[0].text
    assert "on one line" in gaps[0].text


def test_three_sites_off_one_line_tell_everything():
    assert identify(datum_on([(0.0, 0.0), (50e3, 0.0), (0.0, 60e3)])).complete


def test_points_without_tie_are_named_and_the_rest_is_solved():
    model = level_net({"a": (5.0, 0.01)}, [*TRIANGLE, ("x", "y", 7.0, 0.01)])
    adjustment = adjust_network(model)
    assert "points y and x (2 in all) hang on no tie" in adjustment.identifiability.gaps[0].text
    assert adjustment.value({NumberOf("b"): 1.0}) == pytest.approx(6.01, abs=1e-9)
    assert np.isnan(adjustment.value({NumberOf("x"): 1.0}))
    inside = {NumberOf("y"): 1.0, NumberOf("x"): -1.0}
    assert adjustment.value(inside) == pytest.approx(7.0, abs=1e-9)


def test_a_net_without_zero_level_says_so_and_may_be_free():
    model = level_net({}, TRIANGLE)
    assert "the whole net has no zero level" in identify(model).gaps[0].text
    free = adjust_network(model, zero=ZeroRule())
    numbers = [free.value({NumberOf(point): 1.0}) for point in "abc"]
    assert sum(numbers) == pytest.approx(0.0, abs=1e-12)
    held = adjust_network(model, zero=ZeroRule(("a",), 10.0))
    assert held.value({NumberOf("a"): 1.0}) == pytest.approx(10.0, abs=1e-12)
    # What does not depend on the zero level is the same, value and u.
    for other in (held, adjust_network(level_net({"c": (1.0, 0.0)}, TRIANGLE))):
        rise = {NumberOf("b"): 1.0, NumberOf("a"): -1.0}
        assert other.value(rise) == pytest.approx(free.value(rise), abs=1e-12)
        assert other.u(rise) == pytest.approx(free.u(rise), rel=1e-9)
    trace = sum(free.u({NumberOf(point): 1.0}) ** 2 for point in "abc")
    assert trace < sum(held.u({NumberOf(point): 1.0}) ** 2 for point in "abc")


def test_a_zero_level_is_not_defined_twice():
    model = level_net({"a": (0.0, 0.01)}, TRIANGLE)
    with pytest.raises(DataError, match="the zero level is defined twice"):
        adjust_network(model, zero=ZeroRule())
    with pytest.raises(DataError, match="names a site that has no number in the net: z"):
        adjust_network(level_net({}, TRIANGLE), zero=ZeroRule(("z",)))
