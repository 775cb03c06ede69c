"""Recommended frequencies of clock transitions, string-exact, dated and replaceable.

Source of the table: BIPM, "Recommended values of standard frequencies for applications including
the practical realization of the metre and secondary representations of the definition of the
second", documents approved by the CCTF in March 2021, in force from 13 April 2022; hydrogen 1S-2S
from its 2015 document; caesium from the SI. Wavelengths are left out: the printed one of 199Hg does
not agree with its frequency.
"""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from types import MappingProxyType

from clockgeo.errors import DataError
from clockgeo.frequency.ratio import exact_number

__all__ = ["RECOMMENDED_FREQUENCIES", "Transition", "find_transition"]


@dataclass(frozen=True)
class Transition:
    """A clock transition and its recommended frequency.

    Attributes
    ----------
    name : str
        Species and, where it has several, the transition: ``"171Yb+ E3"``.
    levels : str
        The two levels.
    frequency_text : str
        Frequency in Hz as exact decimal text.
    relative_u : float
        Relative standard uncertainty; 0 where the value is exact.
    date : str
        Date of the list it is taken from, ISO 8601.
    source : str
        Where it is published.
    """

    name: str
    levels: str
    frequency_text: str
    relative_u: float
    date: str
    source: str

    @property
    def frequency(self) -> Fraction:
        """Frequency in Hz, exact."""
        return exact_number(self.frequency_text)


_LIST = "BIPM recommended values of standard frequencies, CCTF March 2021"
_DATE = "2022-04-13"
_ROWS = (
    ("87Sr", "1S0-3P0", "429228004229872.99", 1.9e-16),
    ("88Sr", "1S0-3P0", "429228066418007.01", 2.0e-16),
    ("171Yb", "1S0-3P0", "518295836590863.63", 1.9e-16),
    ("171Yb+ E3", "2S1/2-2F7/2", "642121496772645.12", 1.9e-16),
    ("171Yb+ E2", "2S1/2-2D3/2", "688358979309308.24", 2.0e-16),
    ("88Sr+", "2S1/2-2D5/2", "444779044095486.3", 1.3e-15),
    ("40Ca+", "2S1/2-2D5/2", "411042129776400.4", 1.8e-15),
    ("27Al+", "1S0-3P0", "1121015393207859.16", 1.9e-16),
    ("199Hg", "1S0-3P0", "1128575290808154.32", 2.4e-16),
    ("199Hg+", "2S1/2-2D5/2", "1064721609899146.96", 2.2e-16),
    ("115In+", "1S0-3P0", "1267402452901041.3", 4.3e-15),
    ("87Rb", "ground-state hyperfine", "6834682610.9043126", 3.4e-16),
)


def _table() -> Mapping[str, Transition]:
    listed = [Transition(*row, date=_DATE, source=_LIST) for row in _ROWS]
    older = "BIPM recommended values of standard frequencies, hydrogen 1S-2S, 2015"
    hydrogen = Transition("1H", "1S-2S, one photon", "1233030706593514", 9e-15, "2015-09-15", older)
    brochure = "SI Brochure, 9th edition, section 2.2"
    caesium = Transition(
        "133Cs", "ground-state hyperfine", "9192631770", 0.0, "2019-05-20", brochure
    )
    return MappingProxyType({entry.name: entry for entry in [*listed, hydrogen, caesium]})


RECOMMENDED_FREQUENCIES: Mapping[str, Transition] = _table()
"""Name -> recommended frequency, list of 2021."""


def find_transition(
    name: str, *, table: Mapping[str, Transition] = RECOMMENDED_FREQUENCIES
) -> Transition:
    """Look a transition up by name; blanks, case and underscores do not matter.

    Parameters
    ----------
    name : str
        Such as ``"87Sr"`` or ``"171Yb+ E3"``.
    table : mapping of str to Transition, optional
        Another list of frequencies, with its own date.

    Raises
    ------
    DataError
        If there is none of that name; the nearest names are given.
    """
    plain = {_plain(key): entry for key, entry in table.items()}
    if _plain(name) in plain:
        return plain[_plain(name)]
    near = difflib.get_close_matches(_plain(name), plain, n=2, cutoff=0.5)
    advice = f"Did you mean {' or '.join(plain[key].name for key in near)}?" if near else None
    raise DataError(
        "no transition of this name",
        value=repr(name),
        allowed=f"One of {', '.join(table)}, or a frequency in Hz as decimal text",
        advice=advice,
    )


def _plain(name: str) -> str:
    return "".join(name.replace("_", "").split()).lower()
