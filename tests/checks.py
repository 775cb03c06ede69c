"""Comparison helpers: the tolerance follows the printed digits, and the check can fail."""

from __future__ import annotations

from decimal import Decimal

import numpy as np

__all__ = ["assert_close", "assert_published"]


def assert_published(computed: float, printed: str, *, units: float = 0.5) -> None:
    """Assert that `computed` rounds to the `printed` text, and that a neighbour would not.

    Parameters
    ----------
    computed : float
        The value under test.
    printed : str
        The value as the source prints it; its last digit sets the tolerance.
    units : float
        Tolerance in units of the last printed digit. Anything but 0.5 needs a reason beside it.
    """
    text = printed.replace(" ", "").replace("_", "")
    number = Decimal(text)
    exponent = number.as_tuple().exponent
    assert isinstance(exponent, int)
    step = float(Decimal(1).scaleb(exponent))
    assert_close(computed, float(number), tolerance=units * step * (1 + 1e-6), name=printed)


def assert_close(
    computed: float, expected: float, *, tolerance: float, name: str = "value"
) -> None:
    """Assert `|computed - expected| <= tolerance`, and that three tolerances off would fail."""
    assert tolerance > 0.0
    difference = float(computed) - float(expected)
    assert abs(difference) <= tolerance, (
        f"{name}: computed {computed!r}, expected {expected!r}, off by {difference:.3g}, "
        f"allowed {tolerance:.3g}"
    )
    for moved in (computed - 3 * tolerance, computed + 3 * tolerance):
        assert abs(moved - expected) > tolerance, (
            f"{name}: a tolerance of {tolerance} cannot be resolved at {expected!r}"
        )
    assert np.isfinite(computed)
