"""Names of the unknowns that a network adds to those of the clocks."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["DatumTerm", "GeoidTerm", "Term", "TERM_WORDS"]

Term = Literal["offset", "tilt_north", "tilt_east", "elevation", "distance"]

TERM_WORDS: dict[str, str] = {
    "offset": "offset",
    "tilt_north": "tilt north",
    "tilt_east": "tilt east",
    "elevation": "elevation term",
    "distance": "distance term",
}
"""Term -> how it is called in sentences."""


@dataclass(frozen=True)
class DatumTerm:
    """A parameter of a vertical datum: offset in m² s⁻², the others in m² s⁻² a metre."""

    datum: str
    term: Term

    def __str__(self) -> str:
        return f"{TERM_WORDS[self.term]} of datum {self.datum}"


@dataclass(frozen=True)
class GeoidTerm:
    """A parameter of a geoid model: bias in m² s⁻², tilts in m² s⁻² a metre."""

    model: str
    term: Term

    def __str__(self) -> str:
        words = "bias" if self.term == "offset" else TERM_WORDS[self.term]
        return f"{words} of geoid model {self.model}"
