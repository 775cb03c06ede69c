"""Statistics of a campaign: covariance of the session means, dead time, excess scatter."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.evidence import Evidence, GroupEvidence, RecordEvidence
from clockgeo.campaign.grouping import Group, fitted_groups, pair_series
from clockgeo.campaign.measuring import Measured
from clockgeo.campaign.results import NoiseResult, ScatterResult
from clockgeo.campaign.schema import Campaign
from clockgeo.campaign.shared_noise import campaign_span, shared_noise
from clockgeo.frequency import (
    ExcessScatter,
    dead_time_variance,
    diagnose,
    excess_scatter,
    mean_covariance,
    uptime_windows,
)
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.redshift import potential_from_shift
from clockgeo.levelling.session_rows import SessionMean, add_session_rows, stays_of

__all__ = ["SessionStatistics", "session_statistics"]


@dataclass(frozen=True, eq=False)
class SessionStatistics:
    """What the data themselves say about the uncertainty of the session means.

    Attributes
    ----------
    covariance : float array, shape (K, K)
        Statistical covariance of the means, excess scatter included, fractional squared.
    scatter_u : float
        Excess scatter of a session that is included, fractional.
    scatter_covariance : float array, shape (K, K)
        The same for all sessions together, fractional squared.
    freedom : float
        Degrees of freedom of the statistical u of the means, excess scatter included.
    """

    covariance: NDArray[np.float64]
    groups: tuple[Group, ...]
    scatter: ScatterResult | None
    scatter_u: float
    scatter_covariance: NDArray[np.float64]
    freedom: float
    findings: tuple[tuple[str, ...], ...]
    notes: tuple[str, ...]

    @property
    def without_scatter(self) -> NDArray[np.float64]:
        """Statistical covariance of the means without excess scatter."""
        return self.covariance - self.scatter_covariance

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
                    series=tuple(pair_series(measured[place]) for place in group.members),
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
    groups = fitted_groups(campaign, measured, means)
    span = campaign_span(measured) if len(groups) > 1 else None
    covariance = np.zeros((len(measured), len(measured)))
    for group in groups:
        where = np.ix_(group.members, group.members)
        covariance[where] = _group_covariance(group, measured, span)
    notes = [
        f"{group.name}: records too short for a fit; the stated instability is used"
        for group in groups
        if not group.fitted
    ]
    covariance += shared_noise(campaign, groups, measured)
    dead_time = [_dead_time(campaign, one) for one in measured]
    covariance += np.diag(dead_time)
    notes += [
        f"session {one.session.id}: a flywheel over the downtime adds {added**0.5:.2e} to u"
        for one, added in zip(measured, dead_time, strict=True)
        if added > 0.0
    ]
    sharing = _sharing(campaign, means)
    excess = _excess(campaign, covariance, means, sharing)
    scatter_u = excess.standard_deviation if excess is not None else 0.0
    scattered = sharing * scatter_u**2
    return SessionStatistics(
        covariance=covariance + scattered,
        groups=groups,
        scatter=_scatter_result(excess),
        scatter_u=scatter_u,
        scatter_covariance=scattered,
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


def _group_covariance(
    group: Group, measured: Sequence[Measured], span: float | None
) -> NDArray[np.float64]:
    members = [measured[place] for place in group.members]
    signs = np.array([one.direction for one in members])
    block = mean_covariance(
        group.model,
        [pair_series(one) for one in members],
        interval=members[0].record.interval,
        span=span,
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


def _sharing(campaign: Campaign, means: Sequence[SessionMean]) -> NDArray[np.float64]:
    """1 where two sessions have the same offset: each its own, or one a configuration.

    An offset is that of the pair of clocks; run the other way round it has the other sign.
    """
    if campaign.head.scatter != "by_stay":
        return np.eye(len(means))
    stays = stays_of(means)
    numbers: dict[frozenset[tuple[str, str]], int] = {}
    rows = np.zeros((len(means), len(means)))
    for place, mean in enumerate(means):
        ends = [
            (clock.id, stays[clock.id, mean.id]) for clock in (mean.numerator, mean.denominator)
        ]
        column = numbers.setdefault(frozenset(ends), len(numbers))
        rows[place, column] = 1.0 if ends[0] <= ends[1] else -1.0
    return np.asarray(rows @ rows.T)


def _excess(
    campaign: Campaign,
    covariance: NDArray[np.float64],
    means: Sequence[SessionMean],
    sharing: NDArray[np.float64],
) -> ExcessScatter | None:
    """Excess scatter of the sessions about the solution, given all that is stated."""
    if campaign.head.scatter == "none":
        return None
    builder = ModelBuilder()
    add_session_rows(builder, means, covariance, tide_system=campaign.head.tide_system)
    model = builder.build()
    scale = potential_from_shift(1.0)
    return excess_scatter(
        model.values / scale,
        model.covariance() / scale**2,
        model.design.toarray(),
        sharing=sharing,
    )


def _scatter_result(excess: ExcessScatter | None) -> ScatterResult | None:
    if excess is None or excess.degrees_of_freedom == 0:
        return None
    return ScatterResult(
        standard_deviation=excess.standard_deviation,
        lower=excess.lower,
        upper=excess.upper if np.isfinite(excess.upper) else None,
        birge_ratio=excess.birge_ratio,
        applied=excess.standard_deviation > 0.0,
    )
