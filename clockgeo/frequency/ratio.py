"""Exact ratios: decimal text -> fraction -> minus nominal -> float64 y, and back again.

One float64 near 1 steps by 2.2e-16, which is two metres of height. A ratio or an optical frequency
therefore never becomes a float; only its small relative deviation y from an exact nominal does.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from fractions import Fraction
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError

if TYPE_CHECKING:
    import polars as pl

__all__ = [
    "NUMBER",
    "decimal_places",
    "exact_number",
    "fractional_frequency",
    "fractional_from_decimals",
    "ratio_text",
]

NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?")
"""Decimal text of a finite number, without blanks; no longer exponent is believed."""
_GROUPING = re.compile(r"(?<=\d)[ _\u2009\u202f](?=\d)")
_DECIMAL_DIGITS = 37
"""Digits that fit a 128-bit decimal column with one to spare for the sign of a difference."""


def exact_number(text: str) -> Fraction:
    """Turn decimal text, or a quotient of two such texts, into an exact fraction.

    Parameters
    ----------
    text : str
        Such as ``"429 228 004 229 872.99"`` (blanks or underscores may group the digits),
        ``"1.2075e0"`` or ``"518295836590863.63/429228004229872.99"``.

    Returns
    -------
    Fraction
        The number, without any rounding.

    Raises
    ------
    DataError
        If the text is no finite decimal number, or divides by zero.

    Examples
    --------
    >>> exact_number("0.1") * 3 == exact_number("0.3")
    True
    """
    parts = [_GROUPING.sub("", part.strip()) for part in text.split("/")]
    if len(parts) > 2 or not all(NUMBER.fullmatch(part) for part in parts):
        raise DataError(
            "not an exact decimal number",
            value=repr(text),
            allowed="Digits with a decimal point, or two such numbers with / between them",
        )
    numerator, denominator = Fraction(parts[0]), Fraction(parts[-1] if len(parts) == 2 else 1)
    if denominator == 0:
        raise DataError("the denominator is zero", value=repr(text))
    return numerator / denominator


def _check_nominal(nominal: Fraction) -> None:
    if nominal <= 0:
        raise DataError("a nominal value must be positive", value=str(nominal))


def fractional_frequency(ratios: Iterable[str], nominal: Fraction) -> NDArray[np.float64]:
    """Relative deviations of ratios, given as text, from their exact nominal value.

    Parameters
    ----------
    ratios : iterable of str, N items
        Full ratios (or full frequencies in the unit of `nominal`) as decimal text.
    nominal : Fraction
        The exact nominal ratio, > 0.

    Returns
    -------
    float64 array, shape (N,)
        y = ratio/nominal - 1, each rounded once: relative error below 1.2e-16 of y itself.

    Raises
    ------
    DataError
        If a text is no number or the nominal is not positive.

    Examples
    --------
    >>> fractional_frequency(["1.207507039343337850"], exact_number("1.207507039343337849"))
    array([8.28152...e-19])
    """
    _check_nominal(nominal)
    deviations = ((exact_number(text) - nominal) / nominal for text in ratios)
    return np.array([float(deviation) for deviation in deviations], dtype=np.float64)


def decimal_places(nominal: Fraction) -> int:
    """Decimals that a 128-bit column can hold beside the integer part of `nominal` (at most 30)."""
    _check_nominal(nominal)
    return min(30, _DECIMAL_DIGITS - len(str(int(nominal))))


def fractional_from_decimals(column: pl.Series, nominal: Fraction) -> NDArray[np.float64]:
    """Do the work of `fractional_frequency` for a whole column of 128-bit decimals.

    Parameters
    ----------
    column : polars Series of Decimal, N rows
        Full ratios, exact; null where there is none.
    nominal : Fraction
        The exact nominal ratio, > 0.

    Returns
    -------
    float64 array, shape (N,)
        y, NaN where the column is null. The nominal rounded to the column's decimals is subtracted
        in integers, the small difference becomes a float, and what the rounding left out (below
        one unit of the last decimal) is added: the error is below 4e-16 of y, or 1e-30.
    """
    import polars as pl

    _check_nominal(nominal)
    assert isinstance(column.dtype, pl.Decimal)
    unit = Fraction(1, 10**column.dtype.scale)
    subtrahend = round(nominal / unit)
    left_out = float((subtrahend * unit - nominal) / nominal)
    difference = pl.col("ratio").to_physical() - pl.lit(subtrahend, dtype=pl.Int128)
    steps = column.alias("ratio").to_frame().select(difference.cast(pl.Float64))["ratio"]
    return np.asarray(steps.to_numpy() * float(unit / nominal) + left_out)


def ratio_text(y: ArrayLike, nominal: Fraction, *, digits: int) -> list[str]:
    """Write full ratios nominal (1 + y) as decimal text, correctly rounded.

    Parameters
    ----------
    y : array, shape (N,)
        Fractional frequencies, |y| < 1e-3; NaN gives ``"nan"``.
    nominal : Fraction
        The exact nominal ratio, > 0.
    digits : int
        Significant digits, 1 to 36.

    Returns
    -------
    list of str, N items
        Each text is nominal (1 + y) rounded half to even at its last digit; no float holds a ratio
        on the way.

    Raises
    ------
    DataError
        If `digits` is out of range, or a y is infinite or not small.

    Examples
    --------
    >>> ratio_text([0.0, 1e-18], exact_number("1.207507039343337849"), digits=19)
    ['1.207507039343337849', '1.207507039343337850']
    """
    _check_nominal(nominal)
    if not 1 <= digits <= 36:
        raise DataError("cannot write so many digits", value=digits, allowed="1 to 36")
    values = np.atleast_1d(np.asarray(y, dtype=np.float64))
    if np.any(np.abs(values) >= 1e-3):
        worst = values[np.nanargmax(np.abs(values))]
        raise DataError("a fractional frequency is not small", value=worst, allowed="|y| < 1e-3")
    places = digits - _leading_digits(nominal)
    scaled = nominal * Fraction(10) ** places
    steps = [_nearest_step(scaled, v) if v == v else None for v in values.tolist()]
    return ["nan" if step is None else _decimal_text(step, places) for step in steps]


def _nearest_step(scaled: Fraction, y: float) -> int:
    """Integer nearest to scaled (1 + y), half to even; in integers, for `Fraction` is slow."""
    n, d = y.as_integer_ratio()
    numerator, denominator = scaled.numerator * (d + n), scaled.denominator * d
    step, rest = divmod(numerator, denominator)
    return step + (2 * rest > denominator or (2 * rest == denominator and step % 2))


def _leading_digits(nominal: Fraction) -> int:
    """Digits before the decimal point; 0 for 0.1..1, negative for less."""
    power = len(str(nominal.numerator)) - len(str(nominal.denominator))
    return power + 1 if nominal >= Fraction(10) ** power else power


def _decimal_text(steps: int, places: int) -> str:
    """Write `steps` units of 10^-places."""
    if places <= 0:
        return str(steps * 10**-places)
    whole, rest = divmod(steps, 10**places)
    return f"{whole}.{rest:0{places}d}"
