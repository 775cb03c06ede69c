"""What it takes to reach a target: more time, a quieter clock, more uptime, a smaller effect."""

from __future__ import annotations

from collections.abc import Callable, Hashable, Iterator, Sequence
from dataclasses import dataclass

from scipy.optimize import brentq

from clockgeo.frequency import NoiseModel
from clockgeo.levelling.effects import EffectKey
from clockgeo.levelling.redshift import shift_from_potential
from clockgeo.planning.noise import AVERAGING, DEAD_TIME
from clockgeo.planning.prediction import Goal, PlanModel, Prediction, term_of

__all__ = ["EffectNeed", "Need", "averaging_time", "effect_lines", "longer", "need_of"]

_FOREVER = 1e12
"""Factor on all times that stands for no statistics at all."""
_NAMED = 5
_LARGEST = 1e3
"""Factor on an effect beyond which it is called harmless."""


def averaging_time(model: NoiseModel, u: float) -> float | None:
    """Averaging time in s after which the Allan deviation of `model` is down at `u`.

    Parameters
    ----------
    model : NoiseModel
        White and flicker frequency noise count; random walk is left out.
    u : float
        Wanted deviation, fractional.

    Returns
    -------
    float or None
        (σ₁/u)² for white noise alone; None where the flicker floor is not below u.

    Notes
    -----
    Solves σ₁²/τ + floor² = u². For white frequency noise this is the variance of the mean, since
    then the classical and the Allan variance are equal (IEEE Std 1139).
    """
    room = u**2 - model.flicker_fm**2
    return model.white_fm**2 / room if room > 0.0 else None


@dataclass(frozen=True)
class EffectNeed:
    """One line of a budget and what it would have to become.

    Attributes
    ----------
    owner, name : str
        Clock, link, site or shared group; and the effect's name.
    term : str
        The term of the budget that it belongs to.
    u : float
        Its own standard uncertainty on a session, fractional; the largest where it varies.
    part : float
        Its part in the goal's u, m.
    factor : float or None
        What u must be multiplied by to reach the target, all else as it is; None where even
        without the effect the target is missed; above 1 where the target is reached.
    """

    owner: str
    name: str
    term: str
    u: float
    part: float
    factor: float | None

    @property
    def label(self) -> str:
        """Owner and name."""
        return f"{self.owner} · {self.name}" if self.owner else self.name


@dataclass(frozen=True)
class Need:
    """What a goal takes.

    Attributes
    ----------
    predicted_u, floor_u : float
        Of the plan, and with endless time in every session, m.
    time_factor : float or None
        All sessions' lengths times this reach the target; None where no length does.
    uptime_factor : float or None
        All uptimes times this reach the target; None where even full uptime does not.
    full_uptime_u : float
        With full uptime in every session, m.
    effects : tuple of EffectNeed
        The largest effects, largest first.
    """

    goal: Goal
    predicted_u: float
    floor_u: float
    time_factor: float | None
    uptime_factor: float | None
    full_uptime_u: float
    effects: tuple[EffectNeed, ...]

    @property
    def reached(self) -> bool:
        """Whether the plan reaches the target."""
        return self.predicted_u <= self.goal.required_u

    @property
    def stability_factor(self) -> float | None:
        """What the deviation of all clocks and links at 1 s must be multiplied by."""
        return None if self.time_factor is None else float(self.time_factor**-0.5)


def longer(model: PlanModel, factor: float) -> PlanModel:
    """Return the model with all sessions longer by a factor; slow noise stays as it is."""
    return model.with_noise({name: model.parts[name] / factor for name in AVERAGING})


def need_of(prediction: Prediction, goal: Goal) -> Need:
    """Find what it takes to reach a goal.

    Parameters
    ----------
    prediction : Prediction
        Of the plan as it is.
    goal : Goal
    """
    model = prediction.model

    def at(factor: float) -> float:
        return longer(model, factor).solve().u(goal)

    floor = at(_FOREVER)
    full = model.with_noise({DEAD_TIME: 0.0 * model.parts[DEAD_TIME]}).solve().u(goal)
    time_factor = _where_reached(at, goal.required_u, floor)
    uptimes = [one.uptime for one in model.sessions]
    room = 1.0 / max(uptimes)
    uptime_factor = time_factor if time_factor is not None and time_factor <= room else None
    return Need(
        goal=goal,
        predicted_u=prediction.u(goal),
        floor_u=floor,
        time_factor=time_factor,
        uptime_factor=uptime_factor,
        full_uptime_u=full,
        effects=tuple(_effects(prediction, goal)),
    )


def _where_reached(at: Callable[[float], float], wanted: float, floor: float) -> float | None:
    """Factor on the time at which u is as wanted; None where it never is."""
    if floor >= wanted:
        return None
    low, high = -12.0, 12.0

    def excess(exponent: float) -> float:
        return at(10.0**exponent) / wanted - 1.0

    if excess(low) <= 0.0:
        return float(10.0**low)
    return float(10.0 ** brentq(excess, low, high, xtol=1e-10))


def effect_lines(model: PlanModel) -> dict[tuple[str, str], list[Hashable]]:
    """Lines of all budgets: (owner, name) -> the variables of the model that belong to it."""
    lines: dict[tuple[str, str], list[Hashable]] = {}
    for effect in model.others.effects:
        owner, name = (
            (effect.owner, effect.name) if isinstance(effect, EffectKey) else ("", str(effect))
        )
        lines.setdefault((owner, name), []).append(effect)
    return lines


def _effects(prediction: Prediction, goal: Goal) -> Iterator[EffectNeed]:
    model = prediction.model
    parts = {one.effect: one.u for one in prediction.solution.contributions(goal.combination)}
    sizes = model.effect_sizes
    lines = {
        line: sum(parts[effect] ** 2 for effect in effects) ** 0.5
        for line, effects in effect_lines(model).items()
    }
    for line in sorted(lines, key=lambda one: -lines[one])[:_NAMED]:
        if lines[line] > 1e-6 * prediction.u(goal):
            effects = effect_lines(model)[line]
            yield EffectNeed(
                owner=line[0],
                name=line[1],
                term=term_of(effects[0], model.campaign),
                u=shift_from_potential(max(sizes[effect] for effect in effects)),
                part=lines[line],
                factor=_effect_factor(model, goal, effects),
            )


def _effect_factor(model: PlanModel, goal: Goal, effects: Sequence[Hashable]) -> float | None:
    def at(factor: float) -> float:
        return model.with_effects(dict.fromkeys(effects, factor)).solve().u(goal)

    wanted = goal.required_u
    if at(0.0) >= wanted:
        return None
    if at(_LARGEST) <= wanted:
        return _LARGEST
    return float(brentq(lambda factor: at(factor) - wanted, 0.0, _LARGEST, xtol=1e-6))
