"""Recommended frequencies, against the published documents."""

from __future__ import annotations

from fractions import Fraction

import pytest

from clockgeo.errors import DataError
from clockgeo.frequency import RECOMMENDED_FREQUENCIES, Transition, find_transition

# BIPM, "Recommended values of standard frequencies ...", documents approved by the CCTF in March
# 2021; Hz and relative standard uncertainty as printed. 1H: document of 2015, from memory.
PUBLISHED = [
    ("87Sr", "429 228 004 229 872.99", 1.9e-16),
    ("88Sr", "429 228 066 418 007.01", 2.0e-16),
    ("171Yb", "518 295 836 590 863.63", 1.9e-16),
    ("171Yb+ E3", "642 121 496 772 645.12", 1.9e-16),
    ("171Yb+ E2", "688 358 979 309 308.24", 2.0e-16),
    ("88Sr+", "444 779 044 095 486.3", 1.3e-15),
    ("40Ca+", "411 042 129 776 400.4", 1.8e-15),
    ("27Al+", "1 121 015 393 207 859.16", 1.9e-16),
    ("199Hg", "1 128 575 290 808 154.32", 2.4e-16),
    ("199Hg+", "1 064 721 609 899 146.96", 2.2e-16),
    ("115In+", "1 267 402 452 901 041.3", 4.3e-15),
    ("87Rb", "6 834 682 610.904 312 6", 3.4e-16),
    ("1H", "1 233 030 706 593 514", 9e-15),
    ("133Cs", "9 192 631 770", 0.0),
]

# Wavelengths in fm as the same documents print them; 199Hg's is known not to match its frequency.
WAVELENGTHS = [
    ("87Sr", "698445709.61275443", 4),
    ("88Sr", "698445608.41938244", 4),
    ("171Yb", "578419575.91616250", 4),
    ("171Yb+ E3", "466878090.06049678", 4),
    ("171Yb+ E2", "435517610.73968763", 4),
    ("88Sr+", "674025590.8631338", 1),
    ("40Ca+", "729347276.7939427", 1),
    ("27Al+", "267429385.73048867", 4),
    ("199Hg+", "281568867.59196808", 4),
    ("115In+", "236540853.5495455", 1),
]


@pytest.mark.parametrize(("name", "printed", "u"), PUBLISHED, ids=[row[0] for row in PUBLISHED])
def test_frequencies_are_the_published_ones_digit_by_digit(name, printed, u):
    transition = find_transition(name)
    assert transition.frequency_text == printed.replace(" ", "")
    assert transition.relative_u == u
    assert transition.source
    assert transition.date


def test_every_listed_transition_is_checked():
    assert set(RECOMMENDED_FREQUENCIES) == {row[0] for row in PUBLISHED}


@pytest.mark.parametrize(
    ("name", "printed", "units"), WAVELENGTHS, ids=[row[0] for row in WAVELENGTHS]
)
def test_wavelengths_follow_from_frequencies(name, printed, units):
    # The printed digits resolve about 1e-17; the documents round differently in the last digit or
    # two, up to `units` of it.
    wavelength = Fraction(299_792_458) / find_transition(name).frequency * 10**15
    step = Fraction(1, 10 ** len(printed.partition(".")[2]))
    assert abs(wavelength - Fraction(printed)) <= units * step
    wrong = Fraction(299_792_458) / (find_transition(name).frequency + 1) * 10**15
    assert abs(wrong - Fraction(printed)) > units * step


@pytest.mark.parametrize("name", ["87sr", " 171Yb+E3 ", "171yb+_e3"])
def test_case_and_blanks_do_not_matter(name):
    assert find_transition(name).name in RECOMMENDED_FREQUENCIES


def test_an_unknown_name_gets_the_nearest():
    with pytest.raises(DataError, match=r"no transition of this name: '87Srr'.*Did you mean 87Sr"):
        find_transition("87Srr")


def test_the_table_can_be_replaced_by_a_dated_one():
    newer = {
        "87Sr": Transition("87Sr", "1S0-3P0", "429228004229872.992", 1.7e-16, "2030-01-01", "x")
    }
    assert find_transition("87Sr", table=newer).frequency == Fraction("429228004229872.992")
    with pytest.raises(DataError, match="One of 87Sr"):
        find_transition("171Yb", table=newer)
