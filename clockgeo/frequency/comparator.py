"""Comparators: what the open exchange format of fibre-link comparisons says of each of them.

A comparator's output is Δ = (ν_B - ρ0 ν_A)/s_B, with the exact nominal ratio ρ0 and a scale s_B
that its operator chose; in general Δ of A against B is not minus that of B against A. Lodewyck et
al. 2020, Phys. Rev. Research 2, 043269.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction

from clockgeo.errors import DataError
from clockgeo.frequency.ratio import exact_number

__all__ = [
    "KNOWN_KEYS",
    "Comparator",
    "comparator_from",
    "exact_decimal",
    "refuse_contradictions",
]

KNOWN_KEYS = (
    "name",
    "numrhoBA",
    "denrhoBA",
    "sB",
    "nu0A",
    "nu0B",
    "grsA",
    "grsB",
    "uA_sys",
    "uB_sys",
    "interval",
    "lag",
    "weighting",
    "ref_osc",
)
_REQUIRED = ("name", "numrhoBA", "denrhoBA", "sB")


@dataclass(frozen=True)
class Comparator:
    """One comparator and its constants, exact.

    Attributes
    ----------
    name : str
        ``B-A``: the compared oscillator first, each as laboratory_oscillator.
    a, b : str
        Reference oscillator A and compared oscillator B.
    nominal_ratio : Fraction
        ρ0 = numrhoBA/denrhoBA.
    scale : Fraction
        s_B in Hz, of either sign.
    nominal_a, nominal_b : Fraction or None
        Nominal frequencies in Hz, where stated.
    redshift_a, redshift_b : float or None
        Relative corrections for the gravitational redshift that the file offers (`grsA`, `grsB`).
    u_a, u_b : float or None
        Fractional systematic uncertainties that the file states (`uA_sys`, `uB_sys`).
    interval : float or None
        Gate time in s.
    lag : float
        Place of the time tag in the gate: 0 start, 1 end.
    weighting : str or None
        ``pi`` or ``lambda``.
    texts : mapping
        Every key of the entry as text, unknown ones included.
    """

    name: str
    a: str
    b: str
    nominal_ratio: Fraction
    scale: Fraction
    nominal_a: Fraction | None
    nominal_b: Fraction | None
    redshift_a: float | None
    redshift_b: float | None
    u_a: float | None
    u_b: float | None
    interval: float | None
    lag: float
    weighting: str | None
    texts: Mapping[str, str] = field(compare=False)

    def nominal(self, oscillator: str) -> Fraction | None:
        """Nominal frequency of one of its oscillators in Hz, where it is stated or follows."""
        of_a = self.nominal_a
        if of_a is None and self.nominal_b is not None:
            of_a = self.nominal_b / self.nominal_ratio
        of_b = self.nominal_b
        if of_b is None and of_a is not None:
            of_b = of_a * self.nominal_ratio
        return of_a if oscillator == self.a else of_b


def comparator_from(entry: Mapping[str, str], *, where: str) -> Comparator:
    """Make a comparator of an entry of a header, all values as text.

    Raises
    ------
    DataError
        If a key is missing, a number is none, or the name is not ``B-A``.
    """
    missing = [key for key in _REQUIRED if not entry.get(key)]
    if missing:
        raise DataError(
            "a comparator lacks keys",
            value=", ".join(missing),
            where=f"{where}, {entry.get('name')}",
        )
    name = entry["name"]
    parts = name.split("-")
    if len(parts) != 2 or not all(parts) or parts[0] == parts[1]:
        raise DataError(
            "a comparator's name is not two oscillators",
            value=name,
            where=where,
            allowed="LABORATORYB_OSCILLATORB-LABORATORYA_OSCILLATORA",
        )
    place = f"{where}, {name}"

    def exact(key: str) -> Fraction | None:
        text = entry.get(key)
        return _exact(text, key, place) if text else None

    def number(key: str) -> float | None:
        found = exact(key)
        return None if found is None else float(found)

    ratio = _exact(entry["numrhoBA"], "numrhoBA", place) / _positive(entry["denrhoBA"], place)
    weighting = entry.get("weighting") or None
    if weighting not in (None, "pi", "lambda"):
        raise DataError("unknown weighting", value=weighting, where=place, allowed="pi, lambda")
    lag = number("lag")
    return Comparator(
        name=name,
        a=parts[1],
        b=parts[0],
        nominal_ratio=ratio,
        scale=_scale(entry["sB"], place),
        nominal_a=exact("nu0A"),
        nominal_b=exact("nu0B"),
        redshift_a=number("grsA"),
        redshift_b=number("grsB"),
        u_a=number("uA_sys"),
        u_b=number("uB_sys"),
        interval=number("interval"),
        lag=1.0 if lag is None else lag,
        weighting=weighting,
        texts=dict(entry),
    )


def _exact(text: str, key: str, where: str) -> Fraction:
    try:
        return exact_number(text)
    except (DataError, ValueError):
        raise DataError(f"{key} is not a number", value=repr(text), where=where) from None


def _positive(text: str, where: str) -> Fraction:
    value = _exact(text, "a nominal value", where)
    if value <= 0:
        raise DataError("a nominal value must be positive", value=text, where=where)
    return value


def _scale(text: str, where: str) -> Fraction:
    value = _exact(text, "sB", where)
    if not value:
        raise DataError("the scale sB is zero", value=text, where=where)
    return value


def refuse_contradictions(comparators: Iterable[Comparator]) -> None:
    """Refuse two entries of one name, or two that give an oscillator different frequencies.

    Raises
    ------
    DataError
        With the values and the comparators; a silent offset of any size would follow.
    """
    seen: dict[str, Comparator] = {}
    nominal: dict[str, tuple[Fraction, str]] = {}
    for one in comparators:
        if one.name in seen:
            raise DataError("a comparator stands in the headers twice", value=one.name)
        seen[one.name] = one
        for oscillator, stated in ((one.a, one.nominal_a), (one.b, one.nominal_b)):
            if stated is None:
                continue
            before = nominal.setdefault(oscillator, (stated, one.name))
            if before[0] != stated:
                both = [
                    f"{exact_decimal(f)} Hz in {name}" for f, name in (before, (stated, one.name))
                ]
                raise DataError(
                    f"two nominal frequencies of oscillator {oscillator}",
                    value=", ".join(both),
                    advice="One of the headers is wrong; they must agree to the last digit",
                )


def exact_decimal(value: Fraction) -> str:
    """Write a decimal fraction with all its digits, thirty decimals at most."""
    whole, rest = divmod(value.numerator, value.denominator)
    digits = ""
    while rest and len(digits) < 30:
        digit, rest = divmod(rest * 10, value.denominator)
        digits += str(digit)
    return f"{whole}.{digits}" if digits else str(whole)
