"""How numbers are written: value(uncertainty), decided once for the terminal and the page.

Rules. The standard uncertainty is rounded to two significant digits (JCGM 100:2008, 7.2.6), the
value to the same decimal place, both half to even on their shortest decimal form. The uncertainty
stands in brackets in units of the value's last digit; where it reaches beyond the decimal point it
is written with its own: 0.5912(31), 13 624.8(1.2), 12 350(230). Numbers of five or more digits are
grouped by three with a narrow no-break space. Below 0.001 and from a thousand million on, powers of
ten: 1.5159(32)e-13. A number without an uncertainty keeps at most ten significant digits and no
zeros at its end.
"""

from __future__ import annotations

from decimal import ROUND_HALF_EVEN, Context, Decimal
from itertools import pairwise

from clockgeo.errors import DataError

__all__ = [
    "ABSENT",
    "GROUP",
    "duration",
    "in_units_of",
    "percentage",
    "raised",
    "rounded",
    "typeset",
    "with_uncertainty",
]

GROUP = "\u202f"
"""Narrow no-break space between groups of three digits."""
ABSENT = "–"
"""Stands where there is no number."""
_U_DIGITS = 2
_EXACT_DIGITS = 10
_PLAIN_FROM, _PLAIN_BELOW = -3, 9
_EXACT = Context(prec=400)  # no float needs more digits
_SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def with_uncertainty(value: float | None, u: float | None, unit: str = "") -> str:
    """Write a value with its standard uncertainty in brackets.

    Parameters
    ----------
    value : float or None
        None is written as a dash.
    u : float or None
        Standard uncertainty in the same unit, >= 0. None (not stated) and 0 (exact) give the value
        alone.
    unit : str
        Appended after a space.

    Raises
    ------
    DataError
        If a number is not finite or `u` is negative.

    Examples
    --------
    >>> with_uncertainty(13624.7846, 0.1234, "m² s⁻²").replace(GROUP, " ")
    '13 624.78(12) m² s⁻²'
    >>> with_uncertainty(1.51594e-13, 3.2e-17)
    '1.515\u202f94(32)e-13'
    """
    if value is None:
        return ABSENT
    number, doubt = _decimal(value), None if u is None else _decimal(u)
    if doubt is not None and doubt < 0:
        raise DataError("a standard uncertainty is negative", value=u)
    if not doubt:
        return _joined(_plain_or_power(number, _EXACT_DIGITS, keep_zeros=False), unit)
    size = max(number.adjusted() if number else doubt.adjusted(), doubt.adjusted())
    if _PLAIN_FROM <= size < _PLAIN_BELOW:
        return _joined(_bracketed(number, doubt), unit)
    return _joined(f"{_bracketed(number.scaleb(-size), doubt.scaleb(-size))}e{size}", unit)


def in_units_of(value: float | None, step: float, u: float | None, unit: str = "") -> str:
    """Write a value in units of `step`, as in columns headed "1e-18"; otherwise as above.

    >>> in_units_of(-2.374e-18, 1e-18, 1.12e-18)
    '-2.4(1.1)'
    """
    if value is None:
        return ABSENT
    scale = _decimal(step)
    in_steps = None if u is None else float(_decimal(u) / scale)
    return with_uncertainty(float(_decimal(value) / scale), in_steps, unit)


def rounded(value: float | None, digits: int = _U_DIGITS, unit: str = "") -> str:
    """Write a number alone, such as an uncertainty, to `digits` significant digits.

    >>> rounded(0.01234)
    '0.012'
    """
    return ABSENT if value is None else _joined(_plain_or_power(_decimal(value), digits), unit)


def percentage(share: float | None) -> str:
    """Write a share of one in per cent: whole numbers, one decimal below ten.

    >>> percentage(0.684)
    '68\xa0%'
    """
    if share is None:
        return ABSENT
    percent = _decimal(share) * 100
    return f"{_rounded_at(percent, 0 if abs(percent) >= 10 else -1):f}\u00a0%"


def duration(seconds: float | None) -> str:
    """Write a length of time in the two largest units that fit.

    >>> duration(45_120.0)
    '12\xa0h 32\xa0min'
    """
    if seconds is None:
        return ABSENT
    units = (("d", 86_400), ("h", 3_600), ("min", 60), ("s", 1))
    for (large, size), (small, part) in pairwise(units):
        parts = round(seconds / part)
        if parts >= size // part:
            whole, rest = divmod(parts, size // part)
            return f"{whole}\u00a0{large}" + (f" {rest}\u00a0{small}" if rest else "")
    return _joined(_plain_or_power(_decimal(seconds), 3, keep_zeros=False), "s")


def raised(exponent: int) -> str:
    """Write 10 to a whole power.

    >>> raised(-18)
    '10⁻¹⁸'
    """
    return "10" + str(exponent).translate(_SUPERSCRIPTS)


def typeset(text: str) -> str:
    """Turn a number written above into print.

    A true minus, "× 10⁻¹³" for "e-13", and no break between the number and its unit.

    >>> typeset("-1.5159(3)e-13")
    '−1.5159(3)\u202f×\u202f10⁻¹³'
    """
    text = text.replace(" ", "\u00a0")
    mantissa, found, power = text.partition("e")
    if found:
        digits, _, unit = power.partition("\u00a0")
        mantissa += f"{GROUP}×{GROUP}{raised(int(digits))}" + (f"\u00a0{unit}" if unit else "")
    return mantissa.replace("-", "−", 1) if mantissa.startswith("-") else mantissa


def _decimal(value: float) -> Decimal:
    number = Decimal(repr(float(value)))
    if not number.is_finite():
        raise DataError("a number to be written is not finite", value=value)
    return number


def _rounded_at(number: Decimal, place: int) -> Decimal:
    """Round half to even at 10^place."""
    return number.quantize(Decimal(1).scaleb(place), rounding=ROUND_HALF_EVEN, context=_EXACT)


def _to_digits(number: Decimal, digits: int) -> Decimal:
    """Round to significant digits; 0.0996 to two is 0.10, not 0.100."""
    if not number:
        return Decimal(0)
    once = _rounded_at(number, number.adjusted() - digits + 1)
    return _rounded_at(once, once.adjusted() - digits + 1)


def _bracketed(number: Decimal, doubt: Decimal) -> str:
    doubt = _to_digits(doubt, _U_DIGITS)
    exponent = doubt.as_tuple().exponent
    assert isinstance(exponent, int)
    number = _rounded_at(number, exponent)
    beyond_the_point = exponent >= 0 or doubt >= 1
    inside = f"{doubt if beyond_the_point else doubt.scaleb(-exponent):f}"
    return f"{_grouped(number)}({inside})"


def _plain_or_power(number: Decimal, digits: int, *, keep_zeros: bool = True) -> str:
    short = _to_digits(number, digits)
    size = short.adjusted() if short else 0
    plain = _PLAIN_FROM <= size < _PLAIN_BELOW
    if not plain:
        short = short.scaleb(-size)
    short = _rounded_at(short, min(short.adjusted() - digits + 1, 0)) if short else short
    text = _grouped(short if keep_zeros else _shortest(short))
    return text if plain else f"{text}e{size}"


def _shortest(number: Decimal) -> Decimal:
    """Without zeros at the end of its decimals."""
    return number.quantize(Decimal(1)) if number == number.to_integral() else number.normalize()


def _grouped(number: Decimal) -> str:
    text = f"{number:f}"
    if not number:
        text = text.lstrip("-")
    sign, text = ("-", text[1:]) if text.startswith("-") else ("", text)
    whole, point, fraction = text.partition(".")
    return sign + _in_threes(whole, from_right=True) + point + _in_threes(fraction)


def _in_threes(digits: str, *, from_right: bool = False) -> str:
    if len(digits) < 5:
        return digits
    offset = len(digits) % 3 if from_right else 0
    parts = [digits[:offset]] if offset else []
    parts += [digits[start : start + 3] for start in range(offset, len(digits), 3)]
    return GROUP.join(parts)


def _joined(text: str, unit: str) -> str:
    return f"{text} {unit}" if unit else text
