"""The page of `plan`: will it do, what stops it, what to change, and the plan itself."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from clockgeo.planning.results import CostResult, PlanResult
from clockgeo.report import planning_sheets as sheets
from clockgeo.report.levelling_sheets import convention_sheet, input_sheet
from clockgeo.report.numbers import rounded
from clockgeo.report.page import Answer, Page, Picture, Section, write_page
from clockgeo.report.planning_pictures import (
    alternatives_pictures,
    budget_pictures,
    plan_map,
    plan_timeline,
    reach_pictures,
)
from clockgeo.report.sheets import Sheet

__all__ = ["plan_page", "write_plan_page"]

_ANSWERS = 8


def write_plan_page(path: str | Path, result: PlanResult, *, replace: bool = False) -> Path:
    """Write the page of a plan as one self-contained HTML file.

    Parameters
    ----------
    path : path
        Where to.
    result : PlanResult
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    OutputError
        If the file cannot be written, or exists and `replace` is false.
    """
    return write_page(path, plan_page(result), replace=replace)


def plan_page(result: PlanResult) -> Page:
    """Put a plan together as a page."""
    costs = result.costs
    first = min(session.start for session in result.sessions)[:10]
    count = len(result.sessions)
    return Page(
        title=result.name,
        kind="Plan of a clock campaign",
        summary=f"{count} session{'' if count == 1 else 's'}, {costs.days:.1f} days of comparison, "
        f"{first} to {costs.last_stop[:10]} (UTC)",
        answers=tuple(_answers(result)),
        sections=tuple(_sections(result)),
        caution=result.conventions.caution,
        version=result.provenance.version,
    )


def _answers(result: PlanResult) -> Iterator[Answer]:
    for target, limit in list(zip(result.targets, result.limits, strict=True))[:_ANSWERS]:
        kind = "Height difference" if target.kind == "height_difference" else "Offset of datums"
        also = ["Standard uncertainty (k = 1), predicted before there is data."]
        also += [
            f"In {done.runs} simulated campaigns the results scattered by "
            f"{rounded(1e3 * one.realised_u, 3)} mm; between {rounded(1e3 * one.lower, 3)} and "
            f"{rounded(1e3 * one.upper, 3)} mm was to be expected."
            for done in ([result.confirmation] if result.confirmation else [])
            for one in done.targets
            if (one.from_end, one.to_end) == (target.from_end, target.to_end)
        ]
        yield Answer(
            what=f"{kind}, {target.from_end} to {target.to_end}",
            value=f"u = {rounded(1e3 * target.predicted_u, 3)} mm, "
            f"wanted {rounded(1e3 * target.required_u, 3)} mm",
            also=tuple(also),
            verdict=limit.text,
        )


def _sections(result: PlanResult) -> Iterator[Section]:
    reach = [picture for _, picture in reach_pictures(result)]
    yield Section(
        "targets",
        "Targets and what limits them",
        parts=(sheets.target_sheet(result), *reach, sheets.need_sheet(result)),
        notes=result.notes,
    )
    if result.optimum is not None:
        optimum = result.optimum
        told = f"Criterion: {_criterion(optimum.criterion)}."
        told += (
            " Every site is tied by more than one session."
            if optimum.controlled
            else f" Nothing else checks these sessions: {', '.join(optimum.uncontrolled)}."
        )
        yield Section(
            "days",
            "Best use of the days",
            paragraphs=(told, optimum.text),
            parts=(sheets.share_sheet(optimum),),
        )
    yield Section(
        "schedule",
        "Schedule",
        paragraphs=(_cost_words(result.costs),),
        parts=(
            plan_map(result),
            plan_timeline(result),
            sheets.session_sheet(result),
            sheets.stay_sheet(result),
        ),
    )
    yield Section(
        "budget",
        "Predicted uncertainty budget",
        parts=(*budget_pictures(result), sheets.term_sheet(result)),
    )
    yield Section("changes", "What helps most", parts=tuple(sheets.sensitivity_sheets(result)))
    if result.alternatives:
        parts: list[Picture | Sheet] = [*alternatives_pictures(result)]
        parts.append(sheets.alternative_sheet(result))
        yield Section("alternatives", "Other techniques", parts=tuple(parts))
    if result.confirmation is not None:
        yield Section(
            "simulation",
            "Simulated campaigns",
            parts=(sheets.confirmation_sheet(result.confirmation),),
        )
    yield Section("conventions", "Conventions and constants", parts=(convention_sheet(result),))
    yield Section("inputs", "Inputs", parts=(input_sheet(result),))


def _criterion(name: str) -> str:
    return {
        "targets": "the largest ratio of u to its target is made small",
        "A": "the sum of the variances of all sites is made small",
        "D": "the determinant of the covariance of all sites is made small",
        "E": "the largest eigenvalue of the covariance of all sites is made small",
    }[name]


def _cost_words(costs: CostResult) -> str:
    moves = "1 move" if costs.moves == 1 else f"{costs.moves} moves"
    told = f"{costs.days:.1f} days of comparison, {moves}, {costs.distance / 1e3:.0f} km."
    if costs.total or costs.budget is not None:
        told += f" Costs: {costs.total:g} {costs.unit}"
        told += "." if costs.budget is None else f" of {costs.budget:g}."
    if costs.deadline is not None:
        told += f" Last session ends {costs.last_stop[:16]}, deadline {costs.deadline[:16]}."
    return told
