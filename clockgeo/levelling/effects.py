"""Systematic effects, and which sessions feel the same one.

An effect is a random variable of known u, not a number added to a budget. Two sessions that feel
the same variable are correlated; a variable that enters a difference twice with opposite sign
cancels. What makes two appearances the same variable is its key: the clock (or the group that
shares it), the effect's name, and how often it is evaluated anew.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal

from pydantic import Field

from clockgeo.tables import Identifier, Table, Uncertainty

__all__ = ["Effect", "EffectKey", "Renewal", "loading_of"]

Renewal = Literal["never", "stay", "session"]


class Effect(Table):
    """One line of a clock's or link's uncertainty budget, in fractional frequency."""

    name: Identifier
    """What it is, such as black-body radiation."""
    correction: float = 0.0
    """Added to the clock's fractional frequency."""
    u: Uncertainty
    """Standard uncertainty of the correction."""
    shared: Identifier | None = None
    """Group of clocks that have this effect in common, such as a coefficient of the species."""
    renewed: Renewal = "never"
    """When it is evaluated anew: never in the campaign, at each stay at a site, or each session."""


@dataclass(frozen=True)
class EffectKey:
    """Identity of one random variable: owner, effect, and the occasion it belongs to.

    Attributes
    ----------
    owner : str
        Clock, link, site or shared group.
    name : str
        The effect's name.
    occasion : str
        Empty where the variable holds for the whole campaign; else the stay or session.
    """

    owner: str
    name: str
    occasion: str = ""

    def __str__(self) -> str:
        return " · ".join(part for part in (self.owner, self.name, self.occasion) if part)


def loading_of(
    effects: Iterable[Effect], *, owner: str, stay: str, session: str, sign: float
) -> dict[EffectKey, float]:
    """Load of each effect of one clock or link on one session, in fractional frequency.

    Parameters
    ----------
    effects : iterable of Effect
        The budget.
    owner : str
        Clock or link id; replaced by the group for shared effects.
    stay, session : str
        Ids of the occasion; an effect renewed at each of them is a new variable there.
    sign : float
        +1 for the numerator clock and for links, -1 for the denominator clock.

    Returns
    -------
    dict
        Variable -> sign times u. Effects with u = 0 are known exactly and carry no variable.
    """
    loads: dict[EffectKey, float] = {}
    for effect in effects:
        occasion = {"never": "", "stay": stay, "session": session}[effect.renewed]
        key = EffectKey(effect.shared or owner, effect.name, occasion)
        if effect.u:
            loads[key] = loads.get(key, 0.0) + sign * effect.u
    return loads


class EffectList(Table):
    """A named list of effects; base of clocks and links."""

    effects: tuple[Effect, ...] = Field(default=(), alias="effect")
    """Systematic effects, one table each."""

    @property
    def correction(self) -> float:
        """Sum of all corrections, to be added to the fractional frequency; dimensionless."""
        return sum(effect.correction for effect in self.effects)
