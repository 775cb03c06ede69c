"""From a document to one linear model: clock sessions, network tables and the zero level."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.document import Document
from clockgeo.campaign.measuring import Measured, measure_all
from clockgeo.campaign.networking import NetworkRows, add_network
from clockgeo.campaign.plausibility import record_problems
from clockgeo.campaign.statistics import SessionStatistics, session_statistics
from clockgeo.errors import CampaignError, DataError
from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.session_rows import (
    RatioError,
    RatioPrior,
    SessionMean,
    add_known_number,
    add_session_rows,
)
from clockgeo.network.zero_definition import ZeroRule

__all__ = ["Assembled", "SessionSide", "assemble"]


@dataclass(frozen=True, eq=False)
class SessionSide:
    """The clock side: what was measured and its statistics; empty without sessions."""

    measured: tuple[Measured, ...]
    means: tuple[SessionMean, ...]
    statistics: SessionStatistics | None
    systematic: NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Assembled:
    """Everything of a campaign that speaks of the same potential, before it is solved.

    Attributes
    ----------
    document : Document
    model : LinearModel
        Rows that were left out on request are gone.
    zero : ZeroRule or None
        What the zero level hangs on; None for known numbers among the rows.
    sessions : SessionSide
    rows : NetworkRows
    notes : tuple of str
        What was left out, and why.
    """

    document: Document
    model: LinearModel
    zero: ZeroRule | None
    sessions: SessionSide
    rows: NetworkRows
    notes: tuple[str, ...]


def assemble(
    document: Document, *, without: Collection[str] = (), skip_bad_rows: bool = False
) -> Assembled:
    """Put the linear model of a campaign together.

    Parameters
    ----------
    document : Document
        A campaign with network tables; sessions with records take part.
    without : collection of str
        Observations to leave out beside those the document names.
    skip_bad_rows : bool
        Whether rows of records that cannot be read are left out with a note.

    Raises
    ------
    DataError
        If a record or table cannot be used, or there is nothing to adjust.
    CampaignError
        If records contradict the document.
    ConventionError
        If zero levels or tide systems do not fit together.
    """
    campaign = document.campaign
    builder = ModelBuilder()
    zero = _zero_rule(document)
    if zero is None:
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
    if not sessions.measured and not rows.groups:
        raise DataError(
            "there is nothing to adjust",
            where=str(document.path),
            advice="Add sessions with records, [[levelling]], [[datum]] or [[gnss]]",
        )
    notes = [f"observation {name} was left out on request" for name in left_out]
    return Assembled(
        document, model, zero, sessions, rows, (*notes, *_session_notes(document, sessions))
    )


def _zero_rule(document: Document) -> ZeroRule | None:
    settings = document.campaign.network
    if settings.zero == "known":
        return None
    sites = None if settings.zero == "free" else tuple(settings.zero)
    return ZeroRule(sites, settings.zero_mean)


def _add_sessions(
    builder: ModelBuilder, document: Document, left_out: Collection[str], *, skip_bad_rows: bool
) -> SessionSide:
    campaign = document.campaign
    chosen = [
        session for session in campaign.sessions if session.measured and session.id not in left_out
    ]
    measured = tuple(measure_all(campaign, chosen, document.folder, skip_bad_rows=skip_bad_rows))
    if not measured:
        return SessionSide((), (), None, np.zeros(0))
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
    return SessionSide(measured, means, statistics, systematic)


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


def _session_notes(document: Document, sessions: SessionSide) -> list[str]:
    planned = [one.id for one in document.campaign.sessions if not one.measured]
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
