"""From predictions to the tables of the plan."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from clockgeo.campaign.schema import Campaign
from clockgeo.levelling.redshift import shift_from_potential
from clockgeo.levelling.session_rows import stays_of, systematic_loads
from clockgeo.planning.alternatives import (
    break_even_distance,
    distance_between,
    u_of_gnss_geoid,
    u_of_levelling,
)
from clockgeo.planning.limits import words_of
from clockgeo.planning.noise import AVERAGING, FLICKER, LINK_FLOOR
from clockgeo.planning.prediction import (
    EFFECTS,
    RATIO,
    RENEWED,
    STAYS,
    Goal,
    PlanModel,
    Prediction,
)
from clockgeo.planning.requirement import Need, longer
from clockgeo.planning.results import (
    AlternativeResult,
    CostResult,
    LimitResult,
    PlannedSession,
    ReachCurve,
    SensitivityLine,
    SitePlace,
    StayResult,
    TargetResult,
    TechniqueCurves,
    TermLine,
)
from clockgeo.planning.schedule import stays_in, total_cost
from clockgeo.planning.sensitivity import changes
from clockgeo.times import iso_utc

__all__ = [
    "alternative_results",
    "cost_result",
    "limit_result",
    "reach_curve",
    "sensitivity_lines",
    "session_results",
    "site_places",
    "stay_results",
    "target_result",
    "technique_curves",
    "term_lines",
]

_DAY_S = 86_400.0
_STATISTICS = (*AVERAGING, FLICKER, LINK_FLOOR)
_EFFECTS = (EFFECTS, STAYS, RENEWED, RATIO, "effects of links", "site transfer", "tide residual")
_SHOWN = 4
"""So many of the plan's largest terms have a curve of their own."""
_FACTORS = np.geomspace(0.02, 50.0, 35)


def target_result(need: Need) -> TargetResult:
    """One row of the targets."""
    return TargetResult(
        from_end=need.goal.start,
        to_end=need.goal.end,
        kind=need.goal.kind,
        required_u=need.goal.required_u,
        predicted_u=need.predicted_u,
        reached=need.reached,
        floor_u=need.floor_u,
        full_uptime_u=need.full_uptime_u,
        time_factor=need.time_factor,
        stability_factor=need.stability_factor,
        uptime_factor=need.uptime_factor,
    )


def session_results(prediction: Prediction, chosen: set[str]) -> Iterator[PlannedSession]:
    """Sessions in the order of time; `chosen` ones had their length found by the plan."""
    model = prediction.model
    stays = stays_of(model.means)
    statistical = prediction.session_statistics()
    order = sorted(range(len(model.means)), key=lambda k: model.means[k].start_ns)
    for place in order:
        session, mean = model.sessions[place], model.means[place]
        loads = systematic_loads(mean, stays).values()
        length = session.planned_seconds or 0.0
        yield PlannedSession(
            id=session.id,
            numerator_clock=session.numerator.clock,
            numerator_site=session.numerator.site,
            denominator_clock=session.denominator.clock,
            denominator_site=session.denominator.site,
            links=session.links,
            start=iso_utc(mean.start_ns, digits=0),
            stop=iso_utc(mean.start_ns + round(length * 1e9), digits=0),
            days=length / _DAY_S,
            uptime=session.uptime,
            u_statistical=float(statistical[place]),
            u_systematic=shift_from_potential(sum(load**2 for load in loads) ** 0.5),
            chosen=session.id in chosen,
        )


def limit_result(need: Need, prediction: Prediction) -> LimitResult:
    """What stops a target."""
    terms = prediction.terms(need.goal)
    largest = max(terms, key=lambda name: terms[name])
    effect = need.effects[0] if need.effects else None
    return LimitResult(
        from_end=need.goal.start,
        to_end=need.goal.end,
        term=largest,
        share=terms[largest] ** 2 / need.predicted_u**2,
        effect=None if effect is None else effect.label,
        effect_u=None if effect is None else effect.u,
        effect_factor=None if effect is None else effect.factor,
        text=words_of(need, prediction),
    )


def term_lines(prediction: Prediction, goal: Goal) -> Iterator[TermLine]:
    """Split a target's u by term, largest first."""
    terms = prediction.terms(goal)
    for name in sorted(terms, key=lambda one: -terms[one]):
        kind = "geodetic"
        if name in _STATISTICS:
            kind = "statistics"
        elif name in _EFFECTS:
            kind = "effect"
        potential = terms[name] * goal.gravity
        yield TermLine(
            from_end=goal.start,
            to_end=goal.end,
            effect=name,
            kind=kind,
            y=shift_from_potential(potential),
            potential=potential,
            height_mm=1e3 * terms[name],
        )


def alternative_results(
    campaign: Campaign, prediction: Prediction, goals: Sequence[Goal]
) -> Iterator[AlternativeResult]:
    """Other techniques over the distances of the targets between sites."""
    techniques = campaign.plan.alternatives
    for goal in goals:
        if goal.kind != "height_difference":
            continue
        distance = distance_between(campaign.site(goal.start), campaign.site(goal.end))
        u = prediction.u(goal)
        yield AlternativeResult(
            from_end=goal.start,
            to_end=goal.end,
            distance=distance,
            u_clock=u,
            u_levelling=float(u_of_levelling(techniques, distance)),
            u_gnss_geoid=float(u_of_gnss_geoid(techniques, distance)),
            break_even_distance=break_even_distance(techniques, u),
        )


def technique_curves(
    campaign: Campaign, alternatives: Sequence[AlternativeResult]
) -> TechniqueCurves | None:
    """Curves of all techniques around the distances of the targets."""
    if not alternatives:
        return None
    techniques = campaign.plan.alternatives
    ends = [one.distance for one in alternatives]
    ends += [d for one in alternatives if (d := one.break_even_distance) is not None]
    low, high = max(min(ends) / 3.0, 1e3), min(max(ends) * 3.0, 2e7)
    distance = np.geomspace(min(low, high / 10.0), high, 60)
    worst = max(one.u_clock for one in alternatives)
    return TechniqueCurves(
        distance=tuple(distance.tolist()),
        levelling=tuple(u_of_levelling(techniques, distance).tolist()),
        gnss_geoid=tuple(u_of_gnss_geoid(techniques, distance).tolist()),
        clocks=(worst,) * distance.size,
    )


def sensitivity_lines(
    prediction: Prediction, goals: Sequence[Goal], others: Mapping[str, PlanModel]
) -> Iterator[SensitivityLine]:
    """Every change that was tried, for every target, largest gain first."""
    before = [prediction.u(goal) for goal in goals]
    tried = list(changes(prediction, goals, others))
    for place, goal in enumerate(goals):
        for change in sorted(tried, key=lambda one: one.u[place]):
            yield SensitivityLine(
                from_end=goal.start,
                to_end=goal.end,
                change=change.text,
                u=change.u[place],
                gain=before[place] - change.u[place],
            )


def reach_curve(prediction: Prediction, goals: Sequence[Goal]) -> Iterator[ReachCurve]:
    """Predicted u and its terms against the length of all sessions, their shares kept."""
    days = sum(one.planned_seconds or 0.0 for one in prediction.model.sessions) / _DAY_S
    solved = [longer(prediction.model, float(factor)).solve() for factor in _FACTORS]
    planned = {goal.name: prediction.terms(goal) for goal in goals}
    shown = {
        name: sorted(terms, key=lambda one: -terms[one])[:_SHOWN] for name, terms in planned.items()
    }
    for goal in goals:
        split = [_largest_terms(one.terms(goal), shown[goal.name]) for one in solved]
        names = list(dict.fromkeys(name for terms in split for name in terms))
        yield ReachCurve(
            from_end=goal.start,
            to_end=goal.end,
            days=tuple(float(days * factor) for factor in _FACTORS),
            u=tuple(one.u(goal) for one in solved),
            terms={name: tuple(terms.get(name, 0.0) for terms in split) for name in names},
        )


def _largest_terms(terms: Mapping[str, float], shown: Sequence[str]) -> dict[str, float]:
    """The shown terms, and the rest as one."""
    rest = sum(part**2 for name, part in terms.items() if name not in shown) ** 0.5
    return {name: terms.get(name, 0.0) for name in shown} | {"other terms": rest}


def site_places(prediction: Prediction) -> Iterator[SitePlace]:
    """All sites of the document."""
    campaign = prediction.model.campaign
    used = {place.site for session in prediction.model.sessions for place in session.places}
    for site in campaign.sites:
        yield SitePlace(
            id=site.id,
            name=site.label,
            latitude=site.latitude,
            longitude=site.longitude,
            used=site.id in used,
        )


def stay_results(prediction: Prediction) -> Iterator[StayResult]:
    """Stays of every clock."""
    for stay in stays_in(prediction.model.campaign, prediction.model.sessions):
        yield StayResult(
            clock=stay.clock,
            site=stay.site,
            start=f"{stay.start:%Y-%m-%dT%H:%M:%SZ}",
            stop=f"{stay.stop:%Y-%m-%dT%H:%M:%SZ}",
            distance=stay.distance,
        )


def cost_result(prediction: Prediction) -> CostResult:
    """Days, moves, kilometres and whether they fit the budget and the deadline."""
    campaign, sessions = prediction.model.campaign, prediction.model.sessions
    stays = stays_in(campaign, sessions)
    days = sum(one.planned_seconds or 0.0 for one in sessions) / _DAY_S
    total = total_cost(campaign, days, stays)
    budget = campaign.target.budget if campaign.target else None
    deadline = campaign.target.deadline if campaign.target else None
    last = max(stay.stop for stay in stays)
    return CostResult(
        days=days,
        moves=sum(stay.moved for stay in stays),
        distance=sum(stay.distance for stay in stays),
        total=total,
        unit=campaign.plan.costs.unit,
        budget=budget,
        within_budget=None if budget is None else total <= budget * (1.0 + 1e-12),
        last_stop=f"{last:%Y-%m-%dT%H:%M:%SZ}",
        deadline=None if deadline is None else f"{deadline:%Y-%m-%dT%H:%M:%SZ}",
        within_deadline=None if deadline is None else last <= deadline,
    )
