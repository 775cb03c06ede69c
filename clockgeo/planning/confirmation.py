"""Simulated campaigns, whose results must scatter about the truth by the predicted u.

Each run draws the records of the planned sessions from the stated truth, measures and levels them
as real ones, and compares the result with the truth. Network tables are drawn as well, from the
rows that `adjust` would make of them.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from clockgeo.campaign.document import Document
from clockgeo.campaign.leveller import level_measured
from clockgeo.campaign.measuring import Measured, measure_record
from clockgeo.campaign.schema import Campaign, Session
from clockgeo.campaign.statistics import session_statistics
from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.redshift import potential_from_shift
from clockgeo.levelling.session_rows import NumberOf, transfer_difference
from clockgeo.levelling.solution import Solution, solve
from clockgeo.network.unknowns import DatumTerm
from clockgeo.planning.prediction import Goal, PlanModel, Prediction
from clockgeo.planning.results import ConfirmationResult, ConfirmedTarget
from clockgeo.planning.simulation import simulate_sessions
from clockgeo.progress import track

__all__ = ["Confirmation", "confirm"]

_SHARE = 0.95


@dataclass(frozen=True, eq=False)
class Confirmation:
    """Errors of simulated results.

    Attributes
    ----------
    errors, stated : float arrays, shape (runs, goals)
        Estimate minus truth, and the u that each run states itself, m.
    result : ConfirmationResult
    """

    errors: NDArray[np.float64]
    stated: NDArray[np.float64]
    result: ConfirmationResult


def confirm(
    document: Document,
    prediction: Prediction,
    goals: Sequence[Goal],
    *,
    runs: int,
    seed: int = 1,
) -> Confirmation:
    """Simulate, measure and level a planned campaign many times.

    Parameters
    ----------
    document : Document
        With `[truth]`.
    prediction : Prediction
        Of its planned sessions.
    goals : sequence of Goal
    runs : int
        How often, at least 2.
    seed : int
        Equal seeds give equal results.

    Raises
    ------
    DataError
        If there is no truth, or it lacks the number of a site.
    """
    sessions = prediction.model.sessions
    campaign = _simulated(document.campaign, sessions)
    alone = len(prediction.model.others.rows) == len(sessions) + 1
    errors, stated = np.empty((runs, len(goals))), np.empty((runs, len(goals)))
    for run in track(range(runs), "simulating campaigns", runs):
        generator = np.random.default_rng([seed, run])
        measured = [
            measure_record(campaign, one.session, one.record(), folder=document.folder)
            for one in simulate_sessions(campaign, generator, tables=document.folder)
        ]
        if alone:
            solution = level_measured(campaign, measured, folder=document.folder).solution
        else:
            solution = _with_network(campaign, prediction.model, measured, generator)
        for column, goal in enumerate(goals):
            truth = _truth_of(campaign, goal.combination)
            errors[run, column] = solution.value(goal.combination) - truth
            stated[run, column] = solution.u(goal.combination)
    return Confirmation(errors, stated, _result(prediction, goals, errors, stated, seed))


def _simulated(campaign: Campaign, sessions: Sequence[Session]) -> Campaign:
    """The campaign as simulated: planned sessions, nothing else to compare with."""
    truth = campaign.truth
    if truth is None:
        raise DataError(
            "a plan is confirmed against a [truth], and the document has none",
            value=campaign.head.name,
            advice="Add [truth] with geopotential_numbers; round values do",
        )
    used = {place.site for session in sessions for place in session.places}
    lacking = sorted(used - set(truth.geopotential_numbers))
    if lacking:
        raise DataError(
            "sites of the plan have no true number to draw from",
            value=", ".join(lacking),
            where="[truth], geopotential_numbers",
        )
    without_records = tuple(one.model_copy(update={"record": None}) for one in sessions)
    return campaign.model_copy(update={"sessions": without_records, "geoid": None})


def _with_network(
    campaign: Campaign,
    model: PlanModel,
    measured: Sequence[Measured],
    generator: np.random.Generator,
) -> Solution:
    """Solve the plan's own rows with measured sessions and drawn network tables."""
    means = [one.mean(campaign) for one in measured]
    covariance = session_statistics(campaign, measured, means).covariance
    whole = model.with_noise(
        {
            **{name: 0.0 * part for name, part in model.parts.items()},
            "measured": covariance * potential_from_shift(1.0) ** 2,
        }
    ).whole()
    values = _drawn_values(campaign, model.others, generator)
    for row, mean in zip(model.clock_rows.tolist(), means, strict=True):
        transfer = transfer_difference(mean, campaign.head.tide_system)
        values[row] = potential_from_shift(mean.y) - transfer
    return solve(replace(whole, values=values))


def _drawn_values(
    campaign: Campaign, model: LinearModel, generator: np.random.Generator
) -> NDArray[np.float64]:
    """Values that the rows of network tables might have: truth, effects and noise."""
    truth = np.array([_true_unknown(campaign, name) for name in model.unknowns])
    noise = model.noise.toarray()
    values, vectors = np.linalg.eigh(noise)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    drawn = root @ generator.normal(size=len(values))
    effects = model.loading @ generator.normal(size=len(model.effects))
    return np.asarray(model.design @ truth + effects + drawn)


def _true_unknown(campaign: Campaign, name: Hashable) -> float:
    """True value of an unknown in m² s⁻²; terms of datums and points without one are zero."""
    if isinstance(name, NumberOf) and campaign.truth is not None:
        return campaign.truth.geopotential_numbers.get(name.site, 0.0)
    return 0.0


def _truth_of(campaign: Campaign, combination: Mapping[Hashable, float]) -> float:
    return sum(
        0.0 if isinstance(name, DatumTerm) else factor * _true_unknown(campaign, name)
        for name, factor in combination.items()
    )


def _result(
    prediction: Prediction,
    goals: Sequence[Goal],
    errors: NDArray[np.float64],
    stated: NDArray[np.float64],
    seed: int,
) -> ConfirmationResult:
    runs = len(errors)
    realised = np.sqrt(np.mean(errors**2, axis=0))
    tails = (0.5 - _SHARE / 2.0, 0.5 + _SHARE / 2.0)
    low, high = (float(np.sqrt(stats.chi2.ppf(tail, runs) / runs)) for tail in tails)
    targets = []
    for column, goal in enumerate(goals):
        u = prediction.u(goal)
        targets.append(
            ConfirmedTarget(
                from_end=goal.start,
                to_end=goal.end,
                predicted_u=u,
                realised_u=float(realised[column]),
                lower=low * u,
                upper=high * u,
                stated_u=float(np.median(stated[:, column])),
                agrees=bool(low * u <= realised[column] <= high * u),
            )
        )
    return ConfirmationResult(runs=runs, seed=seed, targets=tuple(targets))
