"""The adjustment of a campaign: clock sessions and a height network in one system."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

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
from clockgeo.campaign.assembling import Assembled, SessionSide, assemble
from clockgeo.campaign.datum_tables import datum_results, geoid_results, pair_results, point_results
from clockgeo.campaign.document import Document
from clockgeo.campaign.leveller import session_results
from clockgeo.campaign.networking import NetworkRows
from clockgeo.campaign.results import Conventions, FitResult, Input, Provenance
from clockgeo.campaign.tabulating import (
    budget,
    covariance_of,
    differences,
    site_pairs,
    site_results,
)
from clockgeo.files import sha256_of
from clockgeo.gravity import CAUTION, zero_level
from clockgeo.levelling.session_rows import (
    NumberOf,
)
from clockgeo.network.adjustment import Adjustment, adjust_network
from clockgeo.network.blunders import find_blunders
from clockgeo.network.reliability import Reliability, reliability_of
from clockgeo.version import __version__

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


def adjust(
    document: Document, *, without: Collection[str] = (), skip_bad_rows: bool = False
) -> Adjusted:
    """Adjust clock sessions, levelling, published heights, GNSS heights and gauges together.

    Parameters and errors are those of `assemble`.

    Returns
    -------
    Adjusted
    """
    assembled = assemble(document, without=without, skip_bad_rows=skip_bad_rows)
    settings = document.campaign.network
    adjustment = adjust_network(assembled.model, zero=assembled.zero)
    reliability = reliability_of(adjustment, alpha=settings.alpha, power=settings.power)
    result = _result(assembled, adjustment, reliability)
    return Adjusted(result, adjustment, reliability, assembled.rows)


def _result(assembled: Assembled, adjustment: Adjustment, reliability: Reliability) -> AdjustResult:
    document, sessions, rows = assembled.document, assembled.sessions, assembled.rows
    campaign, statistics = document.campaign, sessions.statistics
    notes = list(assembled.notes)
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
    scatter = statistics.scatter_covariance if statistics else None
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
        effects=tuple(budget(campaign, solution, pairs, scatter)),
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
        robust=robust_result(adjustment, campaign.network.robust, assembled.zero),
        notes=(*notes, *more),
        provenance=_provenance(document, sessions, rows),
    )


def _provenance(document: Document, sessions: SessionSide, rows: NetworkRows) -> Provenance:
    records = {source for one in sessions.measured for source in one.record.sources}
    inputs = [Input(path=source.path, sha256=source.sha256) for source in records]
    inputs += [*rows.inputs, Input(path=document.path.name, sha256=sha256_of(document.path))]
    return Provenance(version=__version__, inputs=tuple(sorted(inputs, key=lambda one: one.path)))
