"""Statistics of a campaign: noise of each pair, covariance of the session means, excess scatter."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.evidence import Evidence, GroupEvidence, RecordEvidence
from clockgeo.campaign.measuring import Measured
from clockgeo.campaign.results import NoiseResult, ScatterResult
from clockgeo.campaign.schema import Campaign
from clockgeo.errors import DataError
from clockgeo.frequency import (
    ExcessScatter,
    NoiseModel,
    TickSeries,
    dead_time_variance,
    diagnose,
    excess_scatter,
    fit_noise,
    mean_covariance,
    uptime_windows,
)
from clockgeo.levelling.correlations import overlap_covariance
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.redshift import potential_from_shift
from clockgeo.levelling.session_rows import SessionMean, add_session_rows

__all__ = ["Group", "SessionStatistics", "session_statistics"]

_SCATTER_FROM = 4
"""Sessions from which excess scatter between them can stand for a floor within them."""
_MATTERS = 0.1
"""A link counts in the grouping where its deviation exceeds this share of the clocks'."""


@dataclass(frozen=True, eq=False)
class Group:
    """Sessions whose noise is one process: same clocks, alike links, one sampling interval.

    Attributes
    ----------
    name : str
    members : tuple of int
        Places in the list of sessions.
    model : NoiseModel
        What uncertainties follow, no less than stated: the likeliest where excess scatter between
        sessions is estimated beside it, else averaged over what the data allow.
    likeliest : NoiseModel
        What is reported as the noise of the pair.
    fitted : bool
        False where the records are too short and the document's model is used.
    degrees_of_freedom : float
        Of the fitted white level; infinite for a stated model.
    """

    name: str
    members: tuple[int, ...]
    model: NoiseModel
    likeliest: NoiseModel
    fitted: bool
    degrees_of_freedom: float


@dataclass(frozen=True, eq=False)
class SessionStatistics:
    """What the data themselves say about the uncertainty of the session means.

    Attributes
    ----------
    covariance : float array, shape (K, K)
        Statistical covariance of the means, excess scatter included, fractional squared.
    scatter_u : float
        Excess scatter that is included, fractional.
    freedom : float
        Degrees of freedom of the statistical u of the means, excess scatter included.
    """

    covariance: NDArray[np.float64]
    groups: tuple[Group, ...]
    scatter: ScatterResult | None
    scatter_u: float
    freedom: float
    findings: tuple[tuple[str, ...], ...]
    notes: tuple[str, ...]

    def noise_results(self, measured: Sequence[Measured]) -> tuple[NoiseResult, ...]:
        """The noise models as they stand in the result; zero levels as null."""
        return tuple(
            NoiseResult(
                pair=group.name,
                sessions=tuple(measured[place].session.id for place in group.members),
                source="fitted" if group.fitted else "stated in the document",
                **{name: level or None for name, level in group.likeliest.model_dump().items()},
            )
            for group in self.groups
        )

    def evidence(self, measured: Sequence[Measured]) -> Evidence:
        """What pictures are drawn from."""
        return Evidence(
            records=tuple(
                RecordEvidence(
                    session=one.session.id,
                    tai_ns=one.record.tai_ns,
                    y=one.record.y,
                    reasons=one.screening.reasons,
                    interval=one.record.interval,
                )
                for one in measured
            ),
            groups=tuple(
                GroupEvidence(
                    name=group.name,
                    sessions=tuple(measured[place].session.id for place in group.members),
                    series=tuple(_series(measured[place]) for place in group.members),
                    interval=measured[group.members[0]].record.interval,
                    model=group.model,
                )
                for group in self.groups
            ),
        )


def session_statistics(
    campaign: Campaign, measured: Sequence[Measured], means: Sequence[SessionMean]
) -> SessionStatistics:
    """Fit the noise of every group, and state the covariance of all session means."""
    groups = tuple(
        _fitted(campaign, name, places, measured)
        for name, places in _grouped(campaign, measured).items()
    )
    covariance = np.zeros((len(measured), len(measured)))
    notes: list[str] = []
    for group in groups:
        where = np.ix_(group.members, group.members)
        covariance[where] = _group_covariance(group, measured)
        if not group.fitted:
            notes.append(
                f"{group.name}: records too short for a fit; the stated instability is used"
            )
    covariance += _overlaps(campaign, groups, measured)
    dead_time = [_dead_time(campaign, one) for one in measured]
    covariance += np.diag(dead_time)
    notes += [
        f"session {one.session.id}: a flywheel over the downtime adds {added**0.5:.2e} to u"
        for one, added in zip(measured, dead_time, strict=True)
        if added > 0.0
    ]
    excess = _excess(campaign, covariance, means)
    applied = excess is not None and excess.standard_deviation > 0.0
    scatter_u = excess.standard_deviation if applied and excess is not None else 0.0
    if applied and excess is not None:
        covariance = covariance + np.eye(len(measured)) * scatter_u**2
    return SessionStatistics(
        covariance=covariance,
        groups=groups,
        scatter=_scatter_result(excess, applied=applied),
        scatter_u=scatter_u,
        freedom=min(
            *(group.degrees_of_freedom for group in groups),
            excess.effective_freedom if excess else float("inf"),
        ),
        findings=tuple(
            tuple(finding.words for finding in diagnose(one.record, valid=one.screening.valid))
            for one in measured
        ),
        notes=tuple(notes),
    )


def _grouped(campaign: Campaign, measured: Sequence[Measured]) -> dict[str, list[int]]:
    groups: dict[str, list[int]] = {}
    for place, one in enumerate(measured):
        name = " - ".join(one.pair)
        links = _links_that_matter(campaign, one)
        if links:
            name += f" over {', '.join(links)}"
        interval = round(one.record.interval, 6)
        key = f"{name}, every {interval:g} s"
        groups.setdefault(key, []).append(place)
    return groups


def _links_that_matter(campaign: Campaign, one: Measured) -> list[str]:
    tau = np.geomspace(100.0, 1e5, 9)
    clocks = campaign.clock(one.pair[0]).instability.combined(
        campaign.clock(one.pair[1]).instability
    )
    limit = _MATTERS**2 * clocks.allan_variance(tau)
    return [
        name
        for name in one.session.links
        if np.any(campaign.link(name).instability.allan_variance(tau) > limit) and np.any(limit > 0)
    ]


def _series(one: Measured) -> TickSeries:
    """Valid samples with the sign of the pair, so that reversed sessions are one process."""
    return TickSeries(one.series.tick, one.direction * one.series.y)


def _fitted(
    campaign: Campaign, name: str, places: Sequence[int], measured: Sequence[Measured]
) -> Group:
    series = [_series(measured[place]) for place in places]
    interval = measured[places[0]].record.interval
    try:
        fit = fit_noise(series, interval=interval)
    except DataError:
        stated = _stated_model(campaign, measured[places[0]])
        if not np.any(stated.allan_variance([1.0, 1e4]) > 0.0):
            raise
        return Group(
            name, tuple(places), stated, stated, fitted=False, degrees_of_freedom=float("inf")
        )
    scatters = campaign.head.scatter == "estimate" and len(measured) >= _SCATTER_FROM
    return Group(
        name,
        tuple(places),
        _no_less_than_stated(
            # A floor that hides within sessions shows between them, as excess scatter.
            fit.model if scatters else fit.averaged,
            _stated_model(campaign, measured[places[0]]),
        ),
        fit.model,
        fitted=True,
        degrees_of_freedom=fit.degrees_of_freedom,
    )


def _no_less_than_stated(fitted: NoiseModel, stated: NoiseModel) -> NoiseModel:
    """Keep the stated slow noise where the data are too short to see it."""
    return fitted.model_copy(
        update={
            name: max(getattr(fitted, name), getattr(stated, name))
            for name in ("flicker_fm", "random_walk_fm")
        }
    )


def _stated_model(campaign: Campaign, one: Measured) -> NoiseModel:
    clocks = [campaign.clock(place.clock).instability for place in one.session.places]
    links = [campaign.link(link).instability for link in one.session.links]
    return NoiseModel().combined(*clocks, *links)


def _group_covariance(group: Group, measured: Sequence[Measured]) -> NDArray[np.float64]:
    members = [measured[place] for place in group.members]
    signs = np.array([one.direction for one in members])
    block = mean_covariance(
        group.model, [_series(one) for one in members], interval=members[0].record.interval
    )
    return np.asarray(np.outer(signs, signs) * block)


def _dead_time(campaign: Campaign, one: Measured) -> float:
    """Variance of carrying the session's uptime to its whole span with the links' flywheels."""
    stated = [campaign.link(link).flywheel for link in one.session.links]
    flywheels = [flywheel for flywheel in stated if flywheel is not None]
    if not flywheels:
        return 0.0
    tick, interval = one.series.tick, one.record.interval
    windows = uptime_windows(tick, interval)
    total = float(tick[-1] - tick[0] + 1) * interval
    return sum(dead_time_variance(flywheel, windows, total) for flywheel in flywheels)


def _overlaps(
    campaign: Campaign, groups: Sequence[Group], measured: Sequence[Measured]
) -> NDArray[np.float64]:
    """Covariance of sessions of different pairs that share a clock at the same time.

    The white noise stated for the clock is in both; its slower noise is small over a session.
    """
    group_of = {place: number for number, group in enumerate(groups) for place in group.members}
    covariance = np.zeros((len(measured), len(measured)))
    for i, j in combinations(range(len(measured)), 2):
        first, second = measured[i], measured[j]
        interval = first.record.interval
        if group_of[i] == group_of[j] or abs(second.record.interval / interval - 1.0) > 1e-9:
            continue
        for one, sign in zip(first.session.places, (1.0, -1.0), strict=True):
            for other, turned in zip(second.session.places, (1.0, -1.0), strict=True):
                if one.clock == other.clock:
                    white = campaign.clock(one.clock).instability.white_fm
                    shared = overlap_covariance(
                        first.series.tick, second.series.tick, interval, white
                    )
                    covariance[i, j] += sign * turned * shared
                    covariance[j, i] = covariance[i, j]
    return covariance


def _excess(
    campaign: Campaign, covariance: NDArray[np.float64], means: Sequence[SessionMean]
) -> ExcessScatter | None:
    """Excess scatter of the sessions about the solution, given all that is stated."""
    if campaign.head.scatter == "none":
        return None
    builder = ModelBuilder()
    add_session_rows(builder, means, covariance, tide_system=campaign.head.tide_system)
    model = builder.build()
    scale = potential_from_shift(1.0)
    return excess_scatter(
        model.values / scale, model.covariance() / scale**2, model.design.toarray()
    )


def _scatter_result(excess: ExcessScatter | None, *, applied: bool) -> ScatterResult | None:
    if excess is None or excess.degrees_of_freedom == 0:
        return None
    return ScatterResult(
        standard_deviation=excess.standard_deviation,
        lower=excess.lower,
        upper=excess.upper if np.isfinite(excess.upper) else None,
        birge_ratio=excess.birge_ratio,
        applied=applied,
    )
