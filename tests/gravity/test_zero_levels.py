"""Zero levels: the published potentials, lookups, conversions and refusals."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_published
from clockgeo.constants import SPEED_OF_LIGHT_SQUARED
from clockgeo.errors import ConventionError
from clockgeo.gravity import (
    GeopotentialNumber,
    TideSystem,
    ZeroLevel,
    convert_zero_level,
    named_zero_levels,
    require_same_zero_level,
    zero_level,
    zero_level_shift,
)

NAMES = ["time_scale", "height_reference", "grs80", "wgs84"]


@pytest.mark.parametrize(
    ("name", "potential"),
    [
        ("time_scale", "62636856.0005"),  # L_G c², IAU 2000 Resolution B1.9
        ("height_reference", "62636853.4"),  # IAG Resolution 1 (2015)
        ("grs80", "62636860.850"),  # Moritz 1980
        ("wgs84", "62636851.7146"),  # NIMA TR8350.2, from memory
    ],
)
def test_named_levels(name, potential):
    level = zero_level(name)
    assert_published(level.w0, potential)
    assert level.source
    assert zero_level(level.w0) == level
    assert zero_level(level) is level
    assert zero_level(repr(level.w0)) == level
    assert named_zero_levels()[name] == level


def test_time_scale_and_height_reference_differ():
    shift = zero_level_shift(source="height_reference", target="time_scale")
    assert_published(shift, "2.6005")
    assert_published(shift / SPEED_OF_LIGHT_SQUARED.value * 1e17, "2.89347")


def test_a_value_of_its_own_becomes_a_level_named_after_it():
    level = zero_level(62_636_855.69)
    assert level.name == "W0 = 62636855.69"
    assert level.w0 == 62_636_855.69


@given(st.sampled_from(NAMES), st.sampled_from(NAMES), st.floats(-1e5, 1e5))
def test_there_and_back(source, target, number):
    there = convert_zero_level(number, source=source, target=target)
    assert convert_zero_level(there, source=target, target=source) == pytest.approx(
        number, abs=1e-9
    )


def test_conversion_keeps_the_potential_of_the_point():
    level = zero_level("grs80")
    converted = convert_zero_level(748.0, source=level, target="time_scale")
    assert zero_level("time_scale").w0 - converted == pytest.approx(level.w0 - 748.0, abs=1e-8)


def test_a_datum_of_unknown_potential_cannot_be_converted():
    datum = ZeroLevel("old harbour", None)
    assert zero_level_shift(source=datum, target=ZeroLevel("old harbour", None)) == 0.0
    with pytest.raises(ConventionError, match=r"old harbour is not known.*adjust"):
        zero_level_shift(source=datum, target="time_scale")
    with pytest.raises(ConventionError, match="benchmark counts from old harbour, clock from time"):
        require_same_zero_level({"benchmark": datum, "clock": "time_scale"})


def test_a_mix_names_both_and_the_difference():
    assert require_same_zero_level({"a": "time_scale", "b": 62_636_856.0005}).name == "time_scale"
    with pytest.raises(
        ConventionError, match=r"site counts from time_scale, grid from grs80.*4\.8495"
    ):
        require_same_zero_level({"site": "time_scale", "grid": "grs80"})


def test_bad_levels_are_refused():
    with pytest.raises(ConventionError, match=r"unknown zero level: 'mean sea'.*time_scale"):
        zero_level("mean sea")
    with pytest.raises(ConventionError, match=r"not the potential of a zero level: 6263685.34"):
        zero_level(6_263_685.34)
    with pytest.raises(ConventionError, match="u of a zero level must not be negative: -1"):
        ZeroLevel("datum", 62_636_853.0, u=-1.0)


def test_a_number_carries_its_conventions():
    number = GeopotentialNumber(748.0, 0.1, "height_reference", "zero_tide")
    assert number.zero_level == zero_level("height_reference")
    moved = number.counted_from("time_scale").in_tide_system("mean_tide", latitude=52.3)
    assert moved.value == pytest.approx(748.0 + 2.600519 + 0.840989, abs=1e-5)
    assert moved.tide_system is TideSystem.MEAN_TIDE
    assert moved.u == 0.1
    lower = GeopotentialNumber(700.0, 0.1, "time_scale", "mean_tide")
    assert moved.above(lower) == pytest.approx(51.441508, abs=1e-5)
    with pytest.raises(ConventionError, match="zero levels do not agree"):
        number.above(lower)
    with pytest.raises(ConventionError, match="tide systems do not agree"):
        number.counted_from("time_scale").above(lower)
    assert number.counted_from("height_reference") is number


def test_the_u_of_a_datum_is_added():
    datum = ZeroLevel("harbour", 62_636_856.5, u=0.3, source="test")
    number = GeopotentialNumber(10.0, 0.4, datum, "mean_tide")
    assert number.counted_from("height_reference").u == pytest.approx(0.5)
    with pytest.raises(ConventionError, match="unknown tide system: 'wet'"):
        GeopotentialNumber(10.0, 0.1, datum, "wet")
    with pytest.raises(ConventionError, match=r"must not be negative: -0.1"):
        GeopotentialNumber(10.0, -0.1, datum, "mean_tide")
