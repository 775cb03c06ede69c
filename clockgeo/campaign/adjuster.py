"""The adjustment of a campaign: clock sessions and a height network in one system."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np

from clockgeo import __version__
from clockgeo.campaign.adjust_results import AdjustResult
from clockgeo.campaign.adjust_tables import (
    blunder_result,
    component_results,
    global_test,
    identifiability_result,
    loop_results,
    observation_results,
    robust_result,
)
from clockgeo.campaign.datum_tables import datum_results, geoid_results, pair_results, point_results
from clockgeo.campaign.document import Document
from clockgeo.campaign.leveller import session_results
from clockgeo.campaign.measuring import Measured, measure
from clockgeo.campaign.networking import NetworkRows, add_network
from clockgeo.campaign.plausibility import record_problems
from clockgeo.campaign.results import Conventions, FitResult, Input, Provenance
from clockgeo.campaign.statistics import SessionStatistics, session_statistics
from clockgeo.campaign.tabulating import (
    budget,
    covariance_of,
    differences,
    site_pairs,
    site_results,
)
from clockgeo.errors import CampaignError, DataError
from clockgeo.files import sha256_of
from clockgeo.gravity import CAUTION, zero_level
from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.session_rows import (
    NumberOf,
    RatioError,
    RatioPrior,
    SessionMean,
    add_known_number,
    add_session_rows,
)
from clockgeo.network.adjustment import Adjustment, adjust_network
from clockgeo.network.blunders import find_blunders
from clockgeo.network.reliability import Reliability, reliability_of
from clockgeo.network.zero_definition import ZeroRule
from clockgeo.progress import track

__all__ = ["Adjusted", "adjust"]

SIGN = (
    "y = (f_n/f_d)/(f_n/f_d)_nominal - 1; positive y: the numerator clock is higher. "
    "C = W0 - W grows with height; H = H_datum + offset + tilts, so that a positive offset means "
    "that the datum's zero surface lies high. Residuals are observed minus adjusted."
)


@dataclass(frozen=True, eq=False)
class Adjusted:
    """A result, and what its pictures and tables are drawn from."""

    result: AdjustResult
    adjustment: Adjustment
    reliability: Reliability
    rows: NetworkRows


@dataclass(frozen=True, eq=False)
class _Sessions:
    """The clock side: what was measured and its statistics; empty without sessions."""

    measured: tuple[Measured, ...]
    means: tuple[SessionMean, ...]
    statistics: SessionStatistics | None
    systematic: np.ndarray


def adjust(
    document: Document, *, without: Collection[str] = (), skip_bad_rows: bool = False
) -> Adjusted:
    """Adjust clock sessions, levelling, published heights, GNSS heights and gauges together.

    Parameters
    ----------
    document : Document
        A campaign with network tables; sessions with records take part.
    without : collection of str
        Observations to leave out beside those the document names; stated in the result's notes.
    skip_bad_rows : bool
        Whether rows of records that cannot be read are left out with a note.

    Returns
    -------
    Adjusted

    Raises
    ------
    DataError
        If a record or table cannot be used, or there is nothing to adjust.
    ConventionError
        If zero levels or tide systems do not fit together.
    """
    campaign = document.campaign
    builder = ModelBuilder()
    rule = _zero_rule(document)
    if rule is None:
        reference = campaign.site(campaign.head.reference_site)
        assert reference.geopotential_number is not None  # the document is refused without it
        add_known_number(
            builder, reference.id, reference.geopotential_number, reference.u_geopotential_number
        )
    left_out = sorted({*campaign.network.without, *without})
    sessions = _add_sessions(builder, document, left_out, skip_bad_rows=skip_bad_rows)
    rows = add_network(builder, document)
    of_sessions = {session.id for session in campaign.sessions}
    model = _without(builder.build(), [name for name in left_out if name not in of_sessions])
    notes = [f"observation {name} was left out on request" for name in left_out]
    if not sessions.measured and not rows.groups:
        raise DataError(
            "there is nothing to adjust",
            where=str(document.path),
            advice="Add sessions with records, [[levelling]], [[datum]] or [[gnss]]",
        )
    adjustment = adjust_network(model, zero=rule)
    reliability = reliability_of(
        adjustment, alpha=campaign.network.alpha, power=campaign.network.power
    )
    notes += _session_notes(document, sessions)
    result = _result(document, sessions, rows, adjustment, reliability, notes)
    return Adjusted(result, adjustment, reliability, rows)


def _zero_rule(document: Document) -> ZeroRule | None:
    settings = document.campaign.network
    if settings.zero == "known":
        return None
    sites = None if settings.zero == "free" else tuple(settings.zero)
    return ZeroRule(sites, settings.zero_mean)


def _add_sessions(
    builder: ModelBuilder, document: Document, left_out: Collection[str], *, skip_bad_rows: bool
) -> _Sessions:
    campaign = document.campaign
    chosen = [
        session
        for session in campaign.sessions
        if session.record is not None and session.id not in left_out
    ]
    measured = tuple(
        measure(campaign, session, document.folder, skip_bad_rows=skip_bad_rows)
        for session in track(chosen, "reading records")
    )
    if not measured:
        return _Sessions((), (), None, np.zeros(0))
    problems = record_problems(measured)
    if problems:
        raise CampaignError(problems, where=str(document.path))
    means = tuple(one.mean(campaign) for one in measured)
    statistics = session_statistics(campaign, measured, means)
    ratios = {
        RatioError.between(one.numerator, one.denominator): RatioPrior(one.u)
        for one in campaign.nominal_ratios
    }
    systematic = add_session_rows(
        builder,
        means,
        statistics.covariance,
        tide_system=campaign.head.tide_system,
        ratios=ratios,
    )
    return _Sessions(measured, means, statistics, systematic)


def _without(model: LinearModel, names: Sequence[str]) -> LinearModel:
    """Leave out rows by their ids."""
    unknown = sorted(set(names) - set(model.rows))
    if unknown:
        raise DataError(
            "an observation to be left out is not there",
            value=", ".join(unknown),
            where="[network], without, or --without",
            advice="Use the ids of the result's observations",
        )
    return model.without(names)


def _session_notes(document: Document, sessions: _Sessions) -> list[str]:
    planned = [one.id for one in document.campaign.sessions if one.record is None]
    notes = [f"session {name} has no record yet and was left out" for name in planned]
    known = [
        site.id
        for site in document.campaign.sites
        if site.geopotential_number is not None and site.id != document.campaign.head.reference_site
    ]
    if known:
        notes.append(
            f"stated numbers of {', '.join(known)} are not part of the adjustment; "
            "only that of the reference site is"
        )
    return notes + (list(sessions.statistics.notes) if sessions.statistics else [])


def _result(
    document: Document,
    sessions: _Sessions,
    rows: NetworkRows,
    adjustment: Adjustment,
    reliability: Reliability,
    notes: list[str],
) -> AdjustResult:
    campaign, statistics = document.campaign, sessions.statistics
    level = zero_level(campaign.head.zero_level)
    solved = [
        site.id
        for site in campaign.sites
        if NumberOf(site.id) in adjustment.place and adjustment.estimable({NumberOf(site.id): 1.0})
    ]
    left = [site.id for site in campaign.sites if site.id not in solved]
    if left:
        notes.append(f"sites without a number from these observations: {', '.join(left)}")
    solution = adjustment.solution_for([NumberOf(name) for name in solved])
    pairs = site_pairs(campaign, solved)
    scatter_u = statistics.scatter_u if statistics else 0.0
    search = find_blunders(reliability)
    groups = dict(rows.groups)
    if sessions.measured:
        groups["clock sessions"] = [one.session.id for one in sessions.measured]
    suspects = [one.row for one in search.suspects]
    components, more = component_results(reliability, groups, suspects)
    factor = adjustment.fit.chi_squared / max(adjustment.fit.degrees_of_freedom, 1)
    return AdjustResult(
        name=campaign.head.name,
        conventions=Conventions(
            sign=SIGN,
            zero_level=level.name,
            w0=level.w0 or 0.0,
            tide_system=campaign.head.tide_system,
            reference_site=campaign.head.reference_site,
            tide=campaign.head.tide,
            ellipsoid="grs80",
            caution=CAUTION,
        ),
        zero_definition=adjustment.zero.text,
        sessions=(
            tuple(
                session_results(
                    sessions.measured,
                    statistics,
                    sessions.systematic,
                    dict(zip(adjustment.model.rows, adjustment.residuals.tolist(), strict=True)),
                )
            )
            if statistics
            else ()
        ),
        sites=tuple(site_results(campaign, solution, solved)),
        differences=tuple(differences(campaign, solution, pairs, statistics)),
        covariance=covariance_of(solution, solved),
        effects=tuple(budget(campaign, solution, pairs, scatter_u)),
        fit=FitResult(
            chi_squared=adjustment.fit.chi_squared,
            degrees_of_freedom=adjustment.fit.degrees_of_freedom,
            p_value=adjustment.fit.p_value,
        ),
        scatter=statistics.scatter if statistics else None,
        noise=statistics.noise_results(sessions.measured) if statistics else (),
        points=tuple(point_results(adjustment, rows.points)),
        pairs=tuple(pair_results(adjustment, campaign.network.pairs)),
        datums=tuple(datum_results(campaign, adjustment, rows)),
        geoid_models=tuple(geoid_results(adjustment, rows.geoid)),
        observations=tuple(observation_results(reliability, groups)),
        variance_factor=factor if adjustment.fit.degrees_of_freedom > 0 else None,
        global_test=global_test(adjustment.fit),
        variance_components=components,
        identifiability=identifiability_result(adjustment, reliability),
        blunders=blunder_result(search),
        loops=tuple(loop_results(adjustment.model)),
        robust=robust_result(adjustment, campaign.network.robust, _zero_rule(document)),
        notes=(*notes, *more),
        provenance=_provenance(document, sessions, rows),
    )


def _provenance(document: Document, sessions: _Sessions, rows: NetworkRows) -> Provenance:
    records = {source for one in sessions.measured for source in one.record.sources}
    inputs = [Input(path=source.path, sha256=source.sha256) for source in records]
    inputs += [*rows.inputs, Input(path=document.path.name, sha256=sha256_of(document.path))]
    return Provenance(version=__version__, inputs=tuple(sorted(inputs, key=lambda one: one.path)))
