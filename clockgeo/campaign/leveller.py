"""The main job: from a document and its records to potential differences and heights."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.correlating import closure_results, correlation_results
from clockgeo.campaign.document import Document
from clockgeo.campaign.evidence import Evidence
from clockgeo.campaign.geodetic import compare, geodetic_numbers, geoid_path
from clockgeo.campaign.measuring import Measured, measure_all
from clockgeo.campaign.plausibility import record_problems
from clockgeo.campaign.results import (
    Conventions,
    FitResult,
    Input,
    LevelResult,
    Provenance,
    SessionResult,
)
from clockgeo.campaign.schema import Campaign
from clockgeo.campaign.site_tides import tide_tables
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
from clockgeo.levelling.redshift import shift_from_potential
from clockgeo.levelling.session_rows import (
    RatioError,
    RatioPrior,
    SessionMean,
    add_known_number,
    add_session_rows,
)
from clockgeo.levelling.solution import Solution, solve
from clockgeo.times import iso_utc
from clockgeo.version import __version__

__all__ = ["Levelled", "doubts_of", "level", "level_measured", "session_results"]

_SIGN = (
    "y = (f_n/f_d)/(f_n/f_d)_nominal - 1; positive y: the numerator clock is higher. "
    "C = W0 - W grows with height; differences are second site minus first."
)


@dataclass(frozen=True, eq=False)
class Levelled:
    """A result, and the data that its pictures are drawn from."""

    result: LevelResult
    evidence: Evidence
    solution: Solution


def level(
    document: Document, *, without: Collection[str] = (), skip_bad_rows: bool = False
) -> Levelled:
    """Run the main job on a campaign document.

    Parameters
    ----------
    document : Document
        A campaign whose sessions have records.
    without : collection of str
        Sessions to leave out; stated in the result's notes.
    skip_bad_rows : bool
        Whether rows that cannot be read are left out with a note, rather than refused.

    Returns
    -------
    Levelled

    Raises
    ------
    DataError
        If a record cannot be used, no session has one, or the sessions do not connect the sites.
    CampaignError
        If records contradict the document: their times, a clock in two places, the nominal ratio.
    ConventionError
        If zero levels or tide systems do not fit together.
    """
    campaign = document.campaign
    chosen = [session for session in campaign.sessions if session.id not in without]
    measured_ones = [session for session in chosen if session.measured]
    if not measured_ones:
        raise DataError(
            "no session has a record",
            where=str(document.path),
            advice="Add records to the sessions, or draw some with clockgeo simulate",
        )
    _refuse_unknown(without, campaign)
    notes = [f"session {name} was left out on request" for name in without]
    notes += [
        f"session {session.id} has no record yet and was left out"
        for session in chosen
        if not session.measured
    ]
    measured = measure_all(campaign, measured_ones, document.folder, skip_bad_rows=skip_bad_rows)
    problems = record_problems(measured)
    if problems:
        raise CampaignError(problems, where=str(document.path))
    return level_measured(
        campaign, measured, folder=document.folder, notes=notes, path=document.path
    )


def doubts_of(measured: Sequence[Measured]) -> list[str]:
    """What must be looked at before anything is made of the sessions."""
    return [f"session {one.session.id}: {doubt}" for one in measured for doubt in one.record.doubts]


def _left_out(campaign: Campaign, solved: Collection[str]) -> list[str]:
    absent = [site.id for site in campaign.sites if site.id not in solved]
    return [f"no session reaches {', '.join(absent)}: no number is given there"] if absent else []


def _refuse_unknown(names: Collection[str], campaign: Campaign) -> None:
    known = [session.id for session in campaign.sessions]
    unknown = [name for name in names if name not in known]
    if unknown:
        raise DataError(
            "there is no such session to leave out",
            value=", ".join(unknown),
            allowed=f"Sessions: {', '.join(known)}",
        )


def level_measured(
    campaign: Campaign,
    measured: Sequence[Measured],
    *,
    folder: Path,
    notes: Sequence[str] = (),
    path: Path | None = None,
) -> Levelled:
    """Solve a campaign whose sessions are already measured; the rest is as in `level`.

    Parameters
    ----------
    campaign : Campaign
    measured : sequence of Measured
        The sessions that take part.
    folder : Path
        Where relative file names start.
    notes : sequence of str
        What happened before and belongs in the result.
    path : Path, optional
        The document's file, for the provenance.
    """
    means = [one.mean(campaign) for one in measured]
    statistics = session_statistics(campaign, measured, means)
    model, systematic = _model(campaign, means, statistics.covariance)
    # A loop is held against what was known before: scatter would be estimated from the loop itself.
    unscattered, _ = _model(campaign, means, statistics.without_scatter)
    solution = solve(model)
    solved = _solved_sites(campaign, means)
    pairs = site_pairs(campaign, solved)
    geodetic = geodetic_numbers(campaign, folder, solved)
    level_used = zero_level(campaign.head.zero_level)
    files = {source for one in measured for source in one.record.sources}
    inputs = [Input(path=source.path, sha256=source.sha256) for source in files]
    if campaign.geoid is not None and geodetic is not None:
        grid = geoid_path(campaign.geoid, folder)
        inputs.append(Input(path=campaign.geoid.grid, sha256=sha256_of(grid)))
    inputs += [Input(path=name, sha256=sha256_of(folder / name)) for name in tide_tables(campaign)]
    if path is not None:
        inputs.append(Input(path=path.name, sha256=sha256_of(path)))
    result = LevelResult(
        name=campaign.head.name,
        conventions=Conventions(
            sign=_SIGN,
            zero_level=level_used.name,
            w0=level_used.w0 or 0.0,
            tide_system=campaign.head.tide_system,
            reference_site=campaign.head.reference_site,
            tide=campaign.head.tide,
            ellipsoid="grs80",
            caution=CAUTION,
        ),
        sessions=tuple(session_results(measured, statistics, systematic, solution.residual_of)),
        sites=tuple(site_results(campaign, solution, solved)),
        differences=tuple(differences(campaign, solution, pairs, statistics)),
        covariance=covariance_of(solution, solved),
        effects=tuple(budget(campaign, solution, pairs, statistics.scatter_covariance)),
        fit=FitResult(
            chi_squared=solution.fit.chi_squared,
            degrees_of_freedom=solution.fit.degrees_of_freedom,
            p_value=solution.fit.p_value,
        ),
        scatter=statistics.scatter,
        noise=statistics.noise_results(measured),
        correlations=tuple(correlation_results(means, solution, solved, pairs)),
        closures=tuple(closure_results(means, unscattered)),
        comparison=tuple(compare(campaign, solution, pairs, geodetic)),
        notes=(*doubts_of(measured), *notes, *_left_out(campaign, solved), *statistics.notes),
        provenance=Provenance(
            version=__version__, inputs=tuple(sorted(inputs, key=lambda one: one.path))
        ),
    )
    return Levelled(result, statistics.evidence(measured), solution)


def _model(
    campaign: Campaign, means: Sequence[SessionMean], covariance: NDArray[np.float64]
) -> tuple[LinearModel, NDArray[np.float64]]:
    """All rows of the campaign, and each session's systematic u in m² s⁻²."""
    builder = ModelBuilder()
    reference = campaign.site(campaign.head.reference_site)
    if reference.geopotential_number is None:
        raise DataError(
            "the reference site has no geopotential number",
            where=f"site {reference.id}",
            advice="Give its geopotential_number in m2 s-2",
        )
    add_known_number(
        builder, reference.id, reference.geopotential_number, reference.u_geopotential_number
    )
    priors = {}
    for ratio in campaign.nominal_ratios:
        priors[RatioError.between(ratio.numerator, ratio.denominator)] = RatioPrior(ratio.u)
    systematic = add_session_rows(
        builder, means, covariance, tide_system=campaign.head.tide_system, ratios=priors
    )
    return builder.build(), systematic


def _solved_sites(campaign: Campaign, means: Sequence[SessionMean]) -> list[str]:
    """Sites with a clock in some session, and the reference, in the document's order."""
    present = {campaign.head.reference_site}
    present |= {m.numerator_site.id for m in means} | {m.denominator_site.id for m in means}
    return [site.id for site in campaign.sites if site.id in present]


def session_results(
    measured: Sequence[Measured],
    statistics: SessionStatistics,
    systematic: NDArray[np.float64],
    residual: Mapping[str, float],
) -> list[SessionResult]:
    """Table of the sessions.

    Parameters
    ----------
    measured : sequence of Measured, length K
    statistics : SessionStatistics
    systematic : float array, shape (K,)
        Systematic standard uncertainty of each session alone, m² s⁻².
    residual : mapping
        Session -> observed minus adjusted, m² s⁻².
    """
    results = []
    for place, one in enumerate(measured):
        variance = float(statistics.covariance[place, place])
        u_statistical = float(np.sqrt(max(variance - statistics.scatter_u**2, 0.0)))
        u_systematic = shift_from_potential(float(systematic[place]))
        n, d = one.session.places
        valid = float(one.series.y.size * one.record.interval)
        results.append(
            SessionResult(
                id=one.session.id,
                numerator_clock=n.clock,
                numerator_site=n.site,
                denominator_clock=d.clock,
                denominator_site=d.site,
                start=iso_utc(one.record.start),
                stop=iso_utc(one.record.stop),
                y=one.y,
                u_statistical=u_statistical,
                u_systematic=u_systematic,
                u_scatter=statistics.scatter_u,
                u=float(np.hypot(np.sqrt(variance), u_systematic)),
                uptime=valid / one.record.span,
                valid_seconds=valid,
                span_seconds=one.record.span,
                interval=one.record.interval,
                correction=one.correction,
                tide_correction=one.tide.mean,
                u_tide_correction=one.tide.u,
                flagged=dict(one.screening.counts),
                y_without_screening=one.y_without_screening,
                residual=shift_from_potential(residual[one.session.id]),
                notes=(*one.record.notes, *statistics.findings[place]),
            )
        )
    return results
