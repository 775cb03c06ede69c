"""Noise told from the lag-1 autocorrelation and R(n)."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.frequency.identification import dominant_exponent, lag_one_exponent
from frequency.power_laws import LAWS, power_law
from frequency.published_sets import thousand


def test_exponents_of_the_thousand_points():
    # Recomputed by hand from the definitions of Riley and Greenhall 2004 (no printed counterpart):
    # r1 = -0.0266581361 and α = 0.0547765 at the factor 1, r1 = -0.1526385069 and 0.3602677 at 10.
    assert_published(lag_one_exponent(thousand()), "0.0547765")
    assert_published(lag_one_exponent(thousand().reshape(-1, 10).mean(axis=1)), "0.3602677")


@pytest.mark.parametrize("alpha", LAWS)
def test_every_law_is_recognised(alpha, rng):
    # Riley and Greenhall recover 2 to -2 within about 0.1 from 2048 points.
    found = [lag_one_exponent(power_law(alpha, 2_048, rng)) for _ in range(10)]
    assert_close(float(np.mean(found)), alpha, tolerance=0.15)
    assert {dominant_exponent(power_law(alpha, 2_048, rng), None, 1) for _ in range(5)} == {alpha}


def test_phase_noises_are_told_apart_by_the_ratio_of_variances(rng):
    # R(n) is 1/n for white PM and 3.37/(3.12 + 3 ln(π n)) for flicker PM (IEEE Std 1139 variances
    # at the bandwidth of the samples), 0.0625 and 0.227 at n = 16.
    averages = power_law(2, 3_200, rng).reshape(-1, 16).mean(axis=1)
    assert dominant_exponent(averages, 0.0625, 16) == 2
    assert dominant_exponent(averages, 0.227, 16) == 1


def test_the_ratio_of_the_thousand_points_leaves_white_fm():
    # R(10) is printed as 0.384 in NIST SP 1065 (from memory), nearest to 0.5 of white FM.
    averages = thousand().reshape(-1, 10).mean(axis=1)
    assert dominant_exponent(averages, 0.384, 10) == 0


def test_constant_and_short_series_are_refused():
    with pytest.raises(DataError, match="constant data show no noise"):
        lag_one_exponent(np.full(40, 3.0))
    with pytest.raises(DataError, match="too few averages to identify the noise"):
        lag_one_exponent(np.arange(29.0))
