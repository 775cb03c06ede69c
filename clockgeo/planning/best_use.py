"""The best use of the days: candidates in, sessions out, with the proof beside them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from clockgeo.campaign.document import Document
from clockgeo.campaign.schema import Session
from clockgeo.planning.allocation import Allocation, allocation_problem
from clockgeo.planning.control import broken_cuts, optimise_controlled, uncontrolled
from clockgeo.planning.design_problem import Array
from clockgeo.planning.optimum import Optimum, optimise
from clockgeo.planning.results import OptimumResult, ShareResult
from clockgeo.planning.rounding import round_to_steps
from clockgeo.planning.schedule import placed_in_time, stays_in, total_cost

__all__ = ["BestUse", "best_use"]

_GAP = 1e-9
_UNITS = {"worst": "ratio of u to its target", "A": "m", "D": "ln(m²)", "E": "m"}


@dataclass(frozen=True, eq=False)
class BestUse:
    """Sessions that the plan chose, and how good the choice is."""

    sessions: tuple[Session, ...]
    result: OptimumResult

    def with_one_more(self, document: Document) -> dict[str, tuple[Session, ...]]:
        """Sessions if a candidate that got nothing had one step: name of the change -> sessions."""
        days = {one.id: one.days for one in self.result.shares}
        step = document.campaign.plan.step
        return {
            f"{step:g} d of {name}, so far left out": tuple(
                placed_in_time(document.campaign, {**days, name: step})
            )
            for name, length in days.items()
            if length == 0.0
        }


def best_use(document: Document) -> BestUse:
    """Share the days out over the candidates.

    Raises
    ------
    DataError
        If the candidates' bounds, the days and the wish for control leave no room.
    """
    campaign = document.campaign
    allocation = allocation_problem(document)
    share = campaign.plan.least_control
    if campaign.plan.no_uncontrolled_tie:
        found = optimise_controlled(allocation.problem, allocation.ties, share, gap=_GAP)
    else:
        found = optimise(allocation.problem, gap=_GAP)
    budget = campaign.target.budget if campaign.target else None

    def allowed(w: Array) -> bool:
        broken = broken_cuts(allocation.ties, w, share) if campaign.plan.no_uncontrolled_tie else ()
        if next(iter(broken), None) is not None:
            return False
        return budget is None or _cost(document, allocation, w) <= budget * (1.0 + 1e-12)

    restricted = campaign.plan.no_uncontrolled_tie or budget is not None
    whole = round_to_steps(
        allocation.problem, found.w, campaign.plan.step, allowed=allowed if restricted else None
    )
    sessions = tuple(placed_in_time(campaign, _days(allocation, whole)))
    return BestUse(sessions, _result(allocation, found, whole))


def _days(allocation: Allocation, w: Array) -> dict[str, float]:
    pairs = zip(allocation.candidates, w.tolist(), strict=True)
    return {candidate.id: days for candidate, days in pairs}


def _cost(document: Document, allocation: Allocation, w: Array) -> float:
    campaign = document.campaign
    sessions = [*campaign.sessions, *placed_in_time(campaign, _days(allocation, w))]
    days = sum(one.planned_seconds or 0.0 for one in sessions) / 86_400.0
    return total_cost(campaign, days, stays_in(campaign, sessions))


def _result(allocation: Allocation, found: Optimum, whole: Array) -> OptimumResult:
    problem = allocation.problem
    rounded = problem.value(whole)
    rounding_gap = rounded / found.bound - 1.0
    if problem.criterion == "D":
        rounding_gap = rounded - found.bound
    alone = uncontrolled(allocation.ties, whole)
    shown = [_shown(problem.criterion, one) for one in (found.value, found.bound, rounded)]
    return OptimumResult(
        criterion="targets" if problem.criterion == "worst" else problem.criterion,
        unit=_UNITS[problem.criterion],
        value=shown[0],
        bound=shown[1],
        certificate_gap=found.gap,
        rounded_value=shown[2],
        rounding_gap=rounding_gap,
        controlled=not alone,
        uncontrolled=tuple(allocation.candidates[k].id for k in alone),
        shares=tuple(
            ShareResult(id=one.id, optimal_days=float(best), days=float(days))
            for one, best, days in zip(allocation.candidates, found.w, whole, strict=True)
        ),
        text=_words(problem.criterion, found.gap, rounding_gap),
    )


def _shown(criterion: str, value: float) -> float:
    """Standard uncertainty or ratio rather than variance; ln of the determinant as it is."""
    return value if criterion == "D" else float(np.sqrt(max(value, 0.0)))


def _words(criterion: str, gap: float, rounding_gap: float) -> str:
    if criterion == "D":
        what, sizes = "ln of the determinant", (f"{gap:.1e}", f"{rounding_gap:.2g}")
    else:
        what, sizes = "variance", (f"{100 * gap:.1e} %", f"{100 * rounding_gap:.2g} %")
    return (
        f"No allocation of these candidates has a {what} smaller than that of the optimum by more "
        f"than {sizes[0]}; rounding to whole steps costs at most {sizes[1]}."
    )
