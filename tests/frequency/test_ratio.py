"""Exact ratios: text to y and back, against plain fractions."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction

import numpy as np
import polars as pl
import pytest
from hypothesis import given
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.frequency import exact_number, fractional_frequency, ratio_text
from clockgeo.frequency.ratio import decimal_places, fractional_from_decimals

NOMINALS = {
    "Yb/Sr": Fraction(51829583659086363, 42922800422987299),
    "Sr/Yb": Fraction(42922800422987299, 51829583659086363),
    "Al+/Sr": Fraction(112101539320785916, 42922800422987299),
    "one third": Fraction(1, 3),
    "Sr in Hz": Fraction(42922800422987299, 100),
    "Sr/Cs": Fraction(42922800422987299, 919263177000),
}


def digits_of(nominal: Fraction, y: Fraction, digits: int) -> str:
    """Decimal text of nominal (1 + y), by the decimal module."""
    ratio = nominal * (1 + y)
    from decimal import localcontext

    with localcontext() as context:
        context.prec = digits
        return format(Decimal(ratio.numerator) / Decimal(ratio.denominator), "f")


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("429 228 004 229 872.99", Fraction(42922800422987299, 100)),
        ("429_228_004_229_872.99", Fraction(42922800422987299, 100)),
        ("-1.5e-3", Fraction(-3, 2000)),
        (".5", Fraction(1, 2)),
        ("3.", Fraction(3)),
        ("1.5/0.25", Fraction(6)),
    ],
)
def test_decimal_texts_are_taken_exactly(text, value):
    assert exact_number(text) == value


@pytest.mark.parametrize("text", ["", "abc", "1,5", "nan", "inf", "1.2.3", "1/2/3", "1 .5", "--1"])
def test_what_is_no_number_is_refused(text):
    with pytest.raises(DataError, match="not an exact decimal number"):
        exact_number(text)


def test_a_quotient_by_zero_is_refused():
    with pytest.raises(DataError, match="denominator is zero"):
        exact_number("1/0.0")


@given(
    name=st.sampled_from(sorted(NOMINALS)),
    steps=st.integers(-(10**12), 10**12),
    digits=st.integers(22, 25),
)
def test_ratios_of_22_to_25_digits_give_y_within_1e_21(name, steps, digits):
    nominal = NOMINALS[name]
    text = digits_of(nominal, Fraction(steps, 10**24), digits)
    exact = (Fraction(text) - nominal) / nominal
    by_text = fractional_frequency([text], nominal)[0]
    column = pl.Series([text]).cast(pl.Decimal(38, decimal_places(nominal)))
    by_column = fractional_from_decimals(column, nominal)[0]
    assert abs(Fraction(by_text) - exact) < Fraction(1, 10**21)
    assert abs(Fraction(by_column) - exact) < Fraction(1, 10**21)
    # What the docstrings promise is far better still.
    assert abs(Fraction(by_text) - exact) <= abs(exact) * Fraction(12, 10**17)


def test_the_check_of_exactness_can_fail_with_floats():
    nominal = NOMINALS["Yb/Sr"]
    text = digits_of(nominal, Fraction(3, 10**18), 24)
    through_one_float = float(text) / float(nominal) - 1.0
    exact = float((Fraction(text) - nominal) / nominal)
    assert abs(through_one_float - exact) > 1e-18


@given(
    name=st.sampled_from(sorted(NOMINALS)),
    y=st.floats(-1e-6, 1e-6),
    digits=st.integers(1, 36),
)
def test_written_ratios_are_the_nearest_with_so_many_digits(name, y, digits):
    nominal = NOMINALS[name]
    text = ratio_text([y], nominal, digits=digits)[0]
    ratio = nominal * (1 + Fraction(y))
    leading = len(str(int(nominal))) if nominal >= 1 else 0
    assert abs(Fraction(text) - ratio) <= Fraction(10) ** (leading - digits) / 2


@given(y=st.floats(-1e-9, 1e-9), name=st.sampled_from(sorted(NOMINALS)))
def test_36_digits_bring_y_back(y, name):
    nominal = NOMINALS[name]
    back = fractional_frequency(ratio_text([y], nominal, digits=36), nominal)[0]
    assert abs(back - y) <= 1e-34


def test_missing_values_stay_missing():
    nominal = NOMINALS["Yb/Sr"]
    assert ratio_text([np.nan], nominal, digits=20) == ["nan"]
    column = pl.Series([None, "1.2"], dtype=pl.String).cast(pl.Decimal(38, 30))
    assert np.isnan(fractional_from_decimals(column, nominal)[0])


def test_ties_go_to_the_even_digit():
    # By hand: 1 + 0.5 units of the last of 3 decimals; 2^-11 is 0.000488..., below half a unit.
    assert ratio_text([0.0], Fraction(2001, 2000), digits=4) == ["1.000"]
    assert ratio_text([0.0], Fraction(2003, 2000), digits=4) == ["1.002"]


@pytest.mark.parametrize("digits", [0, 37])
def test_too_many_digits_are_refused(digits):
    with pytest.raises(DataError, match="so many digits"):
        ratio_text([0.0], NOMINALS["Yb/Sr"], digits=digits)


def test_a_large_y_is_refused():
    with pytest.raises(DataError, match="not small"):
        ratio_text([0.5], NOMINALS["Yb/Sr"], digits=20)


@pytest.mark.parametrize("nominal", [Fraction(0), Fraction(-1)])
def test_a_nominal_must_be_positive(nominal):
    with pytest.raises(DataError, match="must be positive"):
        fractional_frequency(["1.0"], nominal)
