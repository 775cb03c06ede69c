"""What stops each target, in plain words."""

from __future__ import annotations

from clockgeo.planning.prediction import STAYS, Prediction
from clockgeo.planning.requirement import Need

__all__ = ["words_of"]

_SLACK = 1.0 - 1e-9


def words_of(need: Need, prediction: Prediction) -> str:
    """Say whether a goal is reached, what limits it and what would help.

    Parameters
    ----------
    need : Need
    prediction : Prediction
        That it was found from.
    """
    terms = prediction.terms(need.goal)
    largest = max(terms, key=lambda name: terms[name])
    share = terms[largest] ** 2 / need.predicted_u**2
    first = f"u is {_length(need.predicted_u)}, wanted {_length(need.goal.required_u)}; "
    first += f"the largest term is {largest} ({_length(terms[largest])}, {100 * share:.0f} % of u²)"
    if need.reached:
        return f"Reached: {first}.{_spare(need)}"
    if need.time_factor is not None:
        return f"Not reached: {first}. {_with_time(need, prediction)}"
    return f"Cannot be reached by longer sessions: {first}. {_without_time(need)}"


def _spare(need: Need) -> str:
    if need.time_factor is None or need.time_factor >= _SLACK:
        return ""
    return f" {100 * need.time_factor:.0f} % of each session's time would do."


def _with_time(need: Need, prediction: Prediction) -> str:
    factor = need.time_factor or 1.0
    days = sum(one.planned_seconds or 0.0 for one in prediction.model.sessions) / 86_400.0
    ways = [f"sessions {factor:.2f} times as long ({days * factor:.1f} d in all, now {days:.1f} d)"]
    if need.uptime_factor is not None:
        ways.append(f"all uptimes {need.uptime_factor:.2f} times as high")
    if need.stability_factor is not None:
        ways.append(f"white noise of clocks and links times {need.stability_factor:.2f}")
    ways += [
        f"u of {one.label} times {one.factor:.2f}"
        for one in need.effects[:1]
        if one.factor is not None and one.factor < 1.0
    ]
    return f"Any one of these reaches it: {'; '.join(ways)}."


def _without_time(need: Need) -> str:
    if not need.effects:
        return (
            f"Even with endless time u stays at {_length(need.floor_u)}, because of the flicker "
            "floor or the other data: use a clock with a lower floor, or more stays."
        )
    one = need.effects[0]
    common = "reproducibility of each stay" if one.term == STAYS else "common effect"
    answer = f"Even with endless time u stays at {_length(need.floor_u)}, because the {common} "
    answer += f"{one.label} of {one.u:.2g} does not average: "
    if one.factor is None:
        return answer + (
            "even without it the target is missed, so several effects or the flicker floor must "
            "become smaller, or more stays and calibrations share them out."
        )
    advice = "halve it" if one.factor >= 0.5 else f"multiply it by {one.factor:.2f}"
    more = "stay twice" if one.term == STAYS else "calibrate twice"
    return f"{answer}{advice} or {more}."


def _length(metres: float) -> str:
    return f"{1e3 * metres:.1f} mm" if metres < 0.1 else f"{metres:.3f} m"
