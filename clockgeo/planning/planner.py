"""The command's work: from a document with a target to everything that is said about the plan."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from clockgeo.campaign.document import Document
from clockgeo.campaign.results import Conventions, Input, Provenance
from clockgeo.campaign.schema import Session
from clockgeo.files import sha256_of
from clockgeo.gravity import CAUTION, zero_level
from clockgeo.planning.best_use import BestUse, best_use
from clockgeo.planning.checking import refuse_what_cannot_be_planned
from clockgeo.planning.confirmation import confirm
from clockgeo.planning.prediction import PlanModel, Prediction, goals_of, plan_model
from clockgeo.planning.requirement import need_of
from clockgeo.planning.results import CostResult, PlanResult
from clockgeo.planning.tabulating import (
    alternative_results,
    cost_result,
    limit_result,
    reach_curve,
    sensitivity_lines,
    session_results,
    site_places,
    stay_results,
    target_result,
    technique_curves,
    term_lines,
)
from clockgeo.progress import track
from clockgeo.version import __version__

__all__ = ["Planned", "plan"]

_SIGN = "Differences are second minus first; C = W0 - W grows with height."


@dataclass(frozen=True, eq=False)
class Planned:
    """A plan's result, and the prediction that it was read from.

    Attributes
    ----------
    result : PlanResult
    prediction : Prediction
    sessions : tuple of Session
        All sessions of the plan, as they would stand in the document.
    """

    result: PlanResult
    prediction: Prediction
    sessions: tuple[Session, ...]


def plan(document: Document, *, confirm_runs: int = 0, seed: int = 1) -> Planned:
    """Plan a campaign.

    Parameters
    ----------
    document : Document
        With `[target]`, and planned sessions, candidates or both.
    confirm_runs : int
        Campaigns to simulate, see `confirmation.confirm`; 0 for none.
    seed : int
        Of the simulations.

    Raises
    ------
    CampaignError
        If the document cannot be planned; with all problems.
    DataError
        If the sessions do not determine what is wanted.
    """
    refuse_what_cannot_be_planned(document)
    campaign = document.campaign
    best = best_use(document) if campaign.candidates else None
    sessions = (*campaign.sessions, *(best.sessions if best else ()))
    model = plan_model(document, sessions)
    prediction = model.solve()
    goals = goals_of(model)
    needs = [need_of(prediction, goal) for goal in track(goals, "finding what it takes")]
    confirmation = None
    if confirm_runs:
        confirmation = confirm(document, prediction, goals, runs=confirm_runs, seed=seed).result
    level = zero_level(campaign.head.zero_level)
    costs = cost_result(prediction)
    alternatives = tuple(alternative_results(campaign, prediction, goals))
    result = PlanResult(
        name=campaign.head.name,
        conventions=Conventions(
            sign=_SIGN,
            zero_level=level.name,
            w0=level.w0 or 0.0,
            tide_system=campaign.head.tide_system,
            reference_site=campaign.head.reference_site,
            tide=campaign.head.tide,
            ellipsoid="grs80",
            caution=CAUTION,
        ),
        targets=tuple(target_result(need) for need in needs),
        sessions=tuple(session_results(prediction, {one.id for one in campaign.candidates})),
        limits=tuple(limit_result(need, prediction) for need in needs),
        terms=tuple(line for goal in goals for line in term_lines(prediction, goal)),
        alternatives=alternatives,
        techniques=technique_curves(campaign, alternatives),
        sensitivity=tuple(sensitivity_lines(prediction, goals, _left_out(document, best))),
        reach=tuple(reach_curve(prediction, goals)),
        sites=tuple(site_places(prediction)),
        stays=tuple(stay_results(prediction)),
        costs=costs,
        optimum=best.result if best else None,
        confirmation=confirmation,
        notes=(*_notes(costs, sessions), *_scatter_note(document, confirm_runs)),
        provenance=Provenance(
            version=__version__,
            inputs=(Input(path=document.path.name, sha256=sha256_of(document.path)),),
        ),
    )
    return Planned(result, prediction, sessions)


def _scatter_note(document: Document, runs: int) -> Iterator[str]:
    if runs and document.campaign.head.scatter != "none":
        yield (
            "levelling the simulated campaigns estimates excess scatter from a few sessions, which "
            'makes results scatter more than a plan can foresee; scatter = "none" leaves it out'
        )


def _left_out(document: Document, best: BestUse | None) -> dict[str, PlanModel]:
    """Models with a step for each candidate that got nothing."""
    more = best.with_one_more(document) if best else {}
    fixed = document.campaign.sessions
    steps = track(more.items(), "trying sites left out", len(more))
    return {text: plan_model(document, [*fixed, *sessions]) for text, sessions in steps}


def _notes(costs: CostResult, sessions: Sequence[Session]) -> Iterator[str]:
    if costs.within_deadline is False:
        yield f"the last session ends at {costs.last_stop}, after the deadline {costs.deadline}"
    if costs.within_budget is False:
        yield f"the plan costs {costs.total:g} {costs.unit}, more than the {costs.budget:g} allowed"
    measured = [one.id for one in sessions if one.record is not None]
    if measured:
        yield f"planned without their records: {', '.join(measured)}"
