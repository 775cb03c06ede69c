"""Noise models: levels of the spectral density, variances, sums."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from clockgeo.frequency import NoiseModel

LEVELS = st.floats(0.0, 1e-12)


def test_spectral_levels_give_the_tabulated_variances():
    """IEEE Std 1139-2008, table B.2 (recalled): σ² = h0/(2τ), 2 ln 2 h-1, (2π²/3) τ h-2."""
    model = NoiseModel(white_fm=2e-15, flicker_fm=3e-16, random_walk_fm=4e-18)
    tau = 50.0
    assert model.h0 / (2.0 * tau) == pytest.approx(4e-30 / tau, rel=1e-12)
    assert 2.0 * np.log(2.0) * model.h_minus1 == pytest.approx(9e-32, rel=1e-12)
    assert 2.0 * np.pi**2 / 3.0 * tau * model.h_minus2 == pytest.approx(16e-36 * tau, rel=1e-12)


@given(LEVELS, LEVELS, LEVELS, LEVELS, LEVELS, st.floats(1.0, 1e6))
def test_variances_of_independent_parts_add(a, b, c, d, e, tau):
    first = NoiseModel(white_pm=a, white_fm=b, drift=1e-20)
    second = NoiseModel(flicker_pm=c, flicker_fm=d, random_walk_fm=e, white_fm=b, drift=2e-20)
    both = first.combined(second)
    drifts = (both.drift**2 - first.drift**2 - second.drift**2) * tau**2 / 2.0
    expected = first.allan_variance(tau) + second.allan_variance(tau) + drifts
    assert both.allan_variance(tau) == pytest.approx(expected, rel=1e-9)
    assert both.drift == pytest.approx(3e-20, rel=1e-12)


@pytest.mark.parametrize("law", ["white_fm", "flicker_pm"])
def test_negative_levels_are_refused(law):
    with pytest.raises(ValidationError, match="greater than or equal to 0"):
        NoiseModel(**{law: -1e-15})


def test_flicker_phase_falls_by_its_structure_function():
    """σ²(m) = (4 S(m) - S(2m))/(2 m²) with S(n) as Σ 1/(2j - 1), j = 1 to n, summed here."""
    model = NoiseModel(flicker_pm=1.0)
    for m in (1, 4, 32, 1_000):
        change = np.cumsum(1.0 / (2.0 * np.arange(1, 2 * m + 1) - 1.0))
        exact = (4.0 * change[m - 1] - change[2 * m - 1]) / (8.0 / 3.0) / m**2
        assert model.allan_variance(m) == pytest.approx(exact, rel=0.03)
