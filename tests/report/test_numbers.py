"""Numbers in print: the stated rules hold for every number."""

from __future__ import annotations

import doctest
import re
from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.report import numbers
from clockgeo.report.numbers import (
    ABSENT,
    GROUP,
    duration,
    in_units_of,
    percentage,
    rounded,
    typeset,
    with_uncertainty,
)

_WRITTEN = re.compile(r"(-?)([\d.]+)\(([\d.]+)\)(?:e(-?\d+))?")
sizes = st.integers(-25, 8).map(lambda power: 10.0**power)
values = st.builds(lambda m, s: m * s, st.floats(-9.99, 9.99), sizes)
doubts = st.builds(lambda m, s: m * s, st.floats(1.0, 9.99), sizes)


def read_back(text: str) -> tuple[Decimal, Decimal]:
    """Value and uncertainty, read as a person would."""
    found = _WRITTEN.fullmatch(text.replace(GROUP, ""))
    assert found, text
    sign, digits, inside, power = found.groups()
    scale = Decimal(1).scaleb(int(power or 0))
    last = Decimal(1).scaleb(-len(digits.partition(".")[2]))
    doubt = Decimal(inside) if "." in inside else Decimal(inside) * last
    return Decimal(sign + digits) * scale, doubt * scale


@pytest.mark.parametrize(
    ("value", "u", "written"),
    [
        # the first form of JCGM 100:2008, 7.2.2: m_S = 100.021 47(35) g
        (100.02147, 0.00035, "100.021 47(35)"),
        (13624.7846, 0.1234, "13 624.78(12)"),
        (13624.78, 1.234, "13 624.8(1.2)"),
        (12345.6, 234.0, "12 350(230)"),
        (0.5912, 0.0996, "0.59(10)"),
        (-2e-19, 1e-18, "-0.2(1.0)e-18"),
        (0.0, 0.3, "0.00(30)"),
        (-0.001, 0.3, "0.00(30)"),
        (62636853.4, 0.0, "62 636 853.4"),
        (5501.0, None, "5501"),
        (1e-13, None, "1e-13"),
    ],
)
def test_examples_follow_the_rules(value, u, written):
    assert with_uncertainty(value, u).replace(GROUP, " ") == written


@given(values, doubts)
def test_value_and_uncertainty_read_back_within_half_a_unit(value, u):
    number, doubt = read_back(with_uncertainty(value, u))
    last = Decimal(1).scaleb(doubt.adjusted() - 1)  # place of the uncertainty's second digit
    assert abs(number - Decimal(repr(value))) <= Decimal("0.5") * last
    assert abs(doubt / Decimal(repr(u)) - 1) <= Decimal("0.051")


@given(values, doubts)
def test_uncertainty_has_two_significant_digits(value, u):
    _, doubt = read_back(with_uncertainty(value, u))
    digits = doubt.normalize().as_tuple().digits
    assert len(digits) <= 2


@given(values, doubts)
def test_sign_turns_with_the_value(value, u):
    plus, minus = with_uncertainty(abs(value), u), with_uncertainty(-abs(value), u)
    assert minus.removeprefix("-") == plus


@given(st.floats(-1e9, 1e9), st.floats(1e-3, 1e3))
def test_units_only_move_the_point(value, u):
    assert in_units_of(value * 2.0, 2.0, u * 2.0) == with_uncertainty(value, u)


@given(st.integers(0, 10**9))
def test_groups_keep_the_digits(whole):
    text = rounded(float(whole), 17)
    assert text.partition(".")[0].replace(GROUP, "").partition("e")[0] or whole == 0
    assert all(len(part) <= 4 for part in re.split(rf"[{GROUP}.]", text.partition("e")[0]))


def test_what_is_absent_is_a_dash():
    assert with_uncertainty(None, 1.0) == in_units_of(None, 1e-18, None) == ABSENT
    assert rounded(None) == percentage(None) == duration(None) == ABSENT


@pytest.mark.parametrize("bad", [float("nan"), float("inf")])
def test_what_is_not_finite_is_refused(bad):
    with pytest.raises(DataError, match="not finite"):
        with_uncertainty(bad, 1.0)
    with pytest.raises(DataError, match="not finite"):
        with_uncertainty(1.0, bad)


def test_negative_uncertainty_is_refused():
    with pytest.raises(DataError, match="negative: -1"):
        with_uncertainty(1.0, -1.0)


@pytest.mark.parametrize(
    ("seconds", "written"),
    [
        (0.0, "0 s"),
        (12.34, "12.3 s"),
        (59.99, "1 min"),
        (3599.9, "1 h"),
        (45120.0, "12 h 32 min"),
        (1339200.0, "15 d 12 h"),
    ],
)
def test_durations(seconds, written):
    assert duration(seconds).replace("\u00a0", " ") == written


@pytest.mark.parametrize(
    ("share", "written"), [(0.684, "68 %"), (0.0567, "5.7 %"), (1.0, "100 %"), (0.0, "0.0 %")]
)
def test_shares(share, written):
    assert percentage(share).replace("\u00a0", " ") == written


def test_print_form():
    assert typeset("-1.5(3)e-13 m s⁻²") == f"−1.5(3){GROUP}×{GROUP}10⁻¹³\u00a0m\u00a0s⁻²"
    assert typeset("3.2(1.1)") == "3.2(1.1)"


def test_examples_of_the_documentation():
    failed, tried = doctest.testmod(numbers)
    assert tried > 0
    assert failed == 0
