"""From the candidates of a document to a problem of design.

Every candidate is a row of the plan's own model. Its white noise falls with the days it gets; its
effects and its flicker floor do not, and stand as unknowns of unit variance beside the geopotential
numbers, the same unknown wherever it acts.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg

from clockgeo.campaign.document import Document
from clockgeo.campaign.schema import Campaign, Candidate, Session
from clockgeo.errors import DataError
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.planning.control import Ties
from clockgeo.planning.design_problem import Array, Criterion, DesignProblem
from clockgeo.planning.noise import AVERAGING
from clockgeo.planning.prediction import PlanModel, goals_of, plan_model
from clockgeo.planning.schedule import placed_in_time

__all__ = ["Allocation", "allocation_problem"]

_VAGUE = 1e-12
"""Information on every unknown, m⁻⁴ s⁴, so that a site without a visit is vague (1000 km), not
undetermined."""
_EXACT = 1e-8
"""m² s⁻²: standard uncertainty of what is stated as exact."""
_GRAVITY = 9.8
"""m s⁻²; the criteria A, D and E count in m of height."""
_MONTH = 30.0


@dataclass(frozen=True, eq=False)
class Allocation:
    """A problem of design with what its rows stand for.

    Attributes
    ----------
    candidates : tuple of Candidate
        One a row.
    problem : DesignProblem
        Times in days; variances as ratios to the targets, or in m².
    ties : Ties
    """

    candidates: tuple[Candidate, ...]
    problem: DesignProblem
    ties: Ties


def allocation_problem(document: Document) -> Allocation:
    """State the document's candidates as a problem of design.

    Raises
    ------
    DataError, ConventionError
        If the model cannot be built, or a candidate has no white noise.
    """
    campaign = document.campaign
    candidates = campaign.candidates
    length = _typical_days(campaign)
    drafted = placed_in_time(campaign, dict.fromkeys((c.id for c in candidates), length))
    sessions = [*campaign.sessions, *drafted]
    model = plan_model(document, sessions)
    free = np.arange(len(campaign.sessions), len(sessions), dtype=np.int64)
    rows, known, unknowns = _information(model, free)
    averaging = np.sum([model.parts[name] for name in AVERAGING], axis=0)
    variance = np.diag(averaging)[free] * length
    silent = [one.id for one, size in zip(candidates, variance, strict=True) if not size > 0.0]
    if silent:
        raise DataError(
            "candidates without white noise need no time, so days cannot be shared out",
            value=", ".join(silent),
            advice="State the instability of their clocks (white_fm)",
        )
    rate = 1.0 / variance
    wanted = _wanted(model, unknowns, rows.shape[1])
    criterion: Criterion = (
        "worst" if campaign.plan.criterion == "targets" else (campaign.plan.criterion)
    )
    cost, budget = _budget(campaign, len(candidates))
    problem = DesignProblem(
        rows=rows,
        rate=rate,
        known=known,
        wanted=wanted,
        criterion=criterion,
        cost=cost,
        budget=budget,
        least=np.array([one.least_days for one in candidates]),
        most=np.array([np.inf if one.most_days is None else one.most_days for one in candidates]),
        more=np.zeros((0, len(candidates))),
        limit=np.zeros(0),
    )
    if campaign.plan.days is not None and campaign.target and campaign.target.budget is not None:
        priced = np.full(len(candidates), campaign.plan.costs.day)
        if campaign.plan.costs.day > 0.0:
            problem = problem.constrained(priced[None, :], np.array([campaign.target.budget]))
    return Allocation(candidates, problem, _ties(campaign, campaign.sessions, candidates))


def _typical_days(campaign: Campaign) -> float:
    """Length of the drafted sessions; their slow noise hardly depends on it."""
    count = len(campaign.candidates)
    days = campaign.plan.days if campaign.plan.days is not None else 3.0 * count
    return float(np.clip(days / count, campaign.plan.step, _MONTH))


def _budget(campaign: Campaign, count: int) -> tuple[Array, float]:
    if campaign.plan.days is not None:
        return np.ones(count), campaign.plan.days
    budget = campaign.target.budget if campaign.target else None
    return np.full(count, max(campaign.plan.costs.day, 1e-9)), budget or 0.0


def _information(
    model: PlanModel, free: NDArray[np.int64]
) -> tuple[Array, Array, tuple[Hashable, ...]]:
    """Rows of the candidates, what is known without them, and the names of the first columns."""
    others, clocks = model.others, model.clock_rows
    slow = np.sum([part for name, part in model.parts.items() if name not in AVERAGING], axis=0)
    averaging = np.sum([model.parts[name] for name in AVERAGING], axis=0)
    shared = (others.loading @ others.loading.T).toarray()
    shared[np.ix_(clocks, clocks)] += slow
    loading = _root(shared)
    design = others.design.toarray()
    every = np.hstack([design, loading])
    known = np.diag(np.concatenate([np.full(design.shape[1], _VAGUE), np.ones(loading.shape[1])]))
    noise = others.noise.toarray()
    noise[np.ix_(clocks, clocks)] += averaging
    noise[np.diag_indices_from(noise)] += _EXACT**2
    kept = np.setdiff1d(np.arange(len(noise)), clocks[free])
    if kept.size:
        part = every[kept]
        known = known + part.T @ linalg.solve(noise[np.ix_(kept, kept)], part, assume_a="pos")
    return every[clocks[free]], (known + known.T) / 2.0, others.unknowns


def _root(covariance: Array) -> Array:
    """L with L Lᵀ = covariance, for a positive semidefinite one, and as few columns as it takes."""
    values, vectors = np.linalg.eigh(covariance)
    kept = values > 1e-12 * max(float(values[-1]), 1e-300)
    return np.asarray(vectors[:, kept] * np.sqrt(values[kept]))


def _wanted(model: PlanModel, unknowns: tuple[Hashable, ...], size: int) -> Array:
    """Combinations that count: targets over their required u, or all numbers in m."""
    place = {name: i for i, name in enumerate(unknowns)}
    campaign = model.campaign
    if campaign.plan.criterion == "targets":
        combinations = [
            {name: value / goal.required_u for name, value in goal.combination.items()}
            for goal in goals_of(model)
        ]
    else:
        reference = NumberOf(campaign.head.reference_site)
        visited = {
            NumberOf(place.site) for session in model.sessions for place in session.places
        } - {reference}
        combinations = [
            {name: 1.0 / _GRAVITY, reference: -1.0 / _GRAVITY} for name in sorted(visited, key=str)
        ]
    wanted = np.zeros((size, len(combinations)))
    for column, combination in enumerate(combinations):
        for name, value in combination.items():
            wanted[place[name], column] = value
    return wanted


def _ties(campaign: Campaign, sessions: Sequence[Session], candidates: Sequence[Candidate]) -> Ties:
    """Sites and datums as nodes; heights of a datum and levelled lines tie for good."""
    node: dict[tuple[str, str], int] = {}

    def at(kind: str, name: str) -> int:
        return node.setdefault((kind, name), len(node))

    fixed = [
        (
            at("point", one.numerator.site),
            at("point", one.denominator.site),
            (one.planned_seconds or 0.0) / 86_400.0,
        )
        for one in sessions
    ]
    for datum in campaign.datums:
        fixed += [
            (at("datum", datum.id), at("point", height.point), np.inf) for height in datum.heights
        ]
    for levelling in campaign.levellings:
        fixed += [
            (at("point", line.from_point), at("point", line.to_point), np.inf)
            for line in levelling.lines
        ]
    ends = [
        (at("point", one.numerator.site), at("point", one.denominator.site)) for one in candidates
    ]
    return Ties(np.array(ends, dtype=np.int64), tuple(fixed), len(node))
