"""The tide as a correction to y: sign, mean, u."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.gravity import Place, SiteTide, tidal_potential
from clockgeo.levelling.tide_correction import TideCorrection, tide_correction
from clockgeo.times import SECOND_NS, tai_from_iso

EPOCHS = tai_from_iso("2027-03-01T00:00:00Z") + np.arange(7200) * SECOND_NS
HERE, THERE = SiteTide(Place(52.3, 10.5)), SiteTide(Place(35.7, 139.6))


def test_correction_takes_the_tide_out_of_y():
    c2 = 299_792_458.0**2
    n, d = (tidal_potential(EPOCHS, site.place).variable for site in (HERE, THERE))
    measured = 1e-15 - (n - d) / c2  # the tide W lowers C = W0 - W of each clock
    correction = tide_correction(EPOCHS, numerator=HERE, denominator=THERE)
    assert np.max(np.abs(measured + correction.at_epochs - 1e-15)) < 1e-21
    assert correction.mean == pytest.approx(np.mean(n - d) / c2, rel=1e-6)
    assert 0.0 < correction.u < 0.1 * abs(correction.mean) + 1e-18


def test_exchanging_the_clocks_changes_the_sign():
    one = tide_correction(EPOCHS, numerator=HERE, denominator=THERE)
    two = tide_correction(EPOCHS, numerator=THERE, denominator=HERE)
    assert np.allclose(one.at_epochs, -two.at_epochs, rtol=0, atol=1e-26)


def test_part_of_the_epochs():
    whole = tide_correction(EPOCHS, numerator=HERE, denominator=THERE)
    late = np.arange(EPOCHS.size) >= 3600
    part = whole.at(late)
    assert np.array_equal(part.at_epochs, whole.at_epochs[late])
    assert part.mean != whole.mean
    assert part.u > 0.0
    assert whole.at(np.zeros(EPOCHS.size, dtype=bool)).mean == 0.0


def test_no_correction():
    none = TideCorrection.none(5)
    assert np.array_equal(none.at_epochs, np.zeros(5))
    assert (none.mean, none.u) == (0.0, 0.0)
    assert none.at(np.array([True, False, True, True, False])).at_epochs.size == 3
