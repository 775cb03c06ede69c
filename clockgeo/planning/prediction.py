"""What a campaign will deliver: the model of `level` and `adjust`, solved before there is data."""

from __future__ import annotations

from collections.abc import Hashable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import pairwise
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from clockgeo.campaign.document import Document
from clockgeo.campaign.measuring import tide_of
from clockgeo.campaign.networking import NetworkRows, add_network
from clockgeo.campaign.schema import Campaign, Session
from clockgeo.campaign.site_tides import years_from_epoch
from clockgeo.errors import DataError
from clockgeo.gravity import normal_gravity
from clockgeo.levelling.effects import EffectKey
from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.redshift import potential_from_shift, shift_from_potential
from clockgeo.levelling.session_rows import (
    SITE_TRANSFER,
    TIDE,
    UPLIFT,
    NumberOf,
    RatioError,
    RatioPrior,
    SessionMean,
    add_known_number,
    add_session_rows,
)
from clockgeo.levelling.solution import Solution, solve
from clockgeo.levelling.stations import Clock, Link
from clockgeo.network.unknowns import DatumTerm
from clockgeo.planning.noise import noise_parts, window_of

__all__ = ["Goal", "PlanModel", "Prediction", "goals_of", "plan_model", "planned_means", "term_of"]

EFFECTS = "effects of clocks"
STAYS = "reproducibility of stays"
RENEWED = "effects renewed at each session"
RATIO = "nominal ratio"
GEODETIC = "geodetic data"
_TIDE_STEP_NS = 600 * 1_000_000_000


@dataclass(frozen=True, eq=False)
class Goal:
    """One thing that the plan is for.

    Attributes
    ----------
    kind : "height_difference" or "datum_offset"
    start, end : str
        Sites or datums; the quantity is end minus start.
    required_u : float
        Wanted standard uncertainty in m.
    combination : mapping
        Unknown -> coefficient, in m per m² s⁻².
    gravity : float
        m s⁻², from potential to height.
    """

    kind: Literal["height_difference", "datum_offset"]
    start: str
    end: str
    required_u: float
    combination: Mapping[Hashable, float]
    gravity: float

    @property
    def name(self) -> str:
        """Such as "harbel to kesselin"."""
        return f"{self.start} to {self.end}"


@dataclass(frozen=True, eq=False)
class PlanModel:
    """The linear model of a planned campaign, its noise still split by cause.

    Attributes
    ----------
    campaign : Campaign
    sessions : tuple of Session, length K
    means : tuple of SessionMean, length K
    others : LinearModel
        All rows and effects; the noise of the clock rows is not in it.
    parts : dict of str to float array, shape (K, K)
        Their noise by cause, in m⁴ s⁻⁴.
    datum_gravity : dict of str to float
        Gravity that turns the offset of a datum into m.
    """

    campaign: Campaign
    sessions: tuple[Session, ...]
    means: tuple[SessionMean, ...]
    others: LinearModel
    parts: dict[str, NDArray[np.float64]]
    datum_gravity: dict[str, float]

    @cached_property
    def clock_rows(self) -> NDArray[np.int64]:
        """Places of the sessions among the rows."""
        place = {row: i for i, row in enumerate(self.others.rows)}
        return np.array([place[one.id] for one in self.sessions], dtype=np.int64)

    @cached_property
    def effect_sizes(self) -> dict[Hashable, float]:
        """Effect -> its largest load on any row, m² s⁻²."""
        columns = self.others.loading.tocsc()
        largest = [
            float(np.max(np.abs(columns.data[start:stop]), initial=0.0))
            for start, stop in pairwise(columns.indptr.tolist())
        ]
        return dict(zip(self.others.effects, largest, strict=True))

    def with_noise(self, parts: Mapping[str, NDArray[np.float64]]) -> PlanModel:
        """Return the model with some causes of noise replaced."""
        return replace(self, parts={**self.parts, **parts})

    def with_effects(self, factors: Mapping[Hashable, float]) -> PlanModel:
        """Return the model with the u of some effects multiplied."""
        scale = np.array([factors.get(effect, 1.0) for effect in self.others.effects])
        loading = sparse.csr_array(self.others.loading @ sparse.diags_array(scale))
        return replace(self, others=replace(self.others, loading=loading))

    def whole(self) -> LinearModel:
        """Return the model with all its noise, as it is solved; all values are zero."""
        total = np.sum(list(self.parts.values()), axis=0)
        size = len(self.others.rows)
        rows = self.clock_rows
        i, j = np.meshgrid(rows, rows, indexing="ij")
        block = sparse.coo_array((total.ravel(), (i.ravel(), j.ravel())), shape=(size, size))
        return replace(
            self.others,
            values=np.zeros(size),
            noise=sparse.csr_array(self.others.noise + block),
        )

    def solve(self) -> Prediction:
        """Solve it.

        Raises
        ------
        DataError
            If the planned sessions do not determine all unknowns.
        """
        return Prediction(self, solve(self.whole()))


@dataclass(frozen=True, eq=False)
class Prediction:
    """Predicted uncertainties.

    Attributes
    ----------
    model : PlanModel
    solution : Solution
        Its estimates are zero and mean nothing; its covariance is the answer.
    """

    model: PlanModel
    solution: Solution

    def u(self, goal: Goal) -> float:
        """Predicted standard uncertainty in m."""
        return self.solution.u(goal.combination)

    def terms(self, goal: Goal) -> dict[str, float]:
        """Split u by term, in m; the squares add up to u squared. Only terms that are there."""
        weights = self.solution.weights(goal.combination) @ self.solution.gain
        at_clocks = weights[self.model.clock_rows]
        variance = {
            name: float(at_clocks @ part @ at_clocks) for name, part in self.model.parts.items()
        }
        for contribution in self.solution.contributions(goal.combination):
            term = term_of(contribution.effect, self.model.campaign)
            variance[term] = variance.get(term, 0.0) + contribution.u**2
        kinds = set(self.solution.model.kinds) - {"clock"}
        for kind in sorted(kinds):
            term = "known number of the reference site" if kind == "known" else GEODETIC
            part = self.solution.noise_u(goal.combination, kind) ** 2
            variance[term] = variance.get(term, 0.0) + part
        floor = 1e-16 * sum(variance.values())
        return {name: part**0.5 for name, part in variance.items() if part > floor}

    def session_statistics(self) -> NDArray[np.float64]:
        """Statistical standard uncertainty of every session alone, fractional, shape (K,)."""
        variance = np.diag(np.sum(list(self.model.parts.values()), axis=0))
        return np.asarray(shift_from_potential(np.sqrt(variance)))


def term_of(effect: Hashable, campaign: Campaign) -> str:
    """Name of the term that an effect of the model belongs to."""
    if not isinstance(effect, EffectKey):
        return GEODETIC
    if effect.name == TIDE:
        return "tide residual"
    if effect.name.startswith(SITE_TRANSFER) or effect.name == UPLIFT:
        return "site transfer"
    if effect.name.startswith("nominal ratio to"):
        return RATIO
    owners: list[Clock | Link] = [*campaign.clocks, *campaign.links]
    budgets = {owner.id for owner in owners}
    groups = {one.shared for owner in owners for one in owner.effects}
    if effect.owner not in (budgets | groups):
        return GEODETIC
    if effect.owner in {link.id for link in campaign.links}:
        return "effects of links"
    if effect.occasion.startswith("stay "):
        return STAYS
    return RENEWED if effect.occasion else EFFECTS


def plan_model(document: Document, sessions: Sequence[Session]) -> PlanModel:
    """Build the model of planned sessions; with the network tables if a target asks for datums.

    Parameters
    ----------
    document : Document
    sessions : sequence of Session
        With start, length and uptime; their records are not looked at.

    Raises
    ------
    DataError, ConventionError
        If a session has no length, or a network table cannot be used.
    """
    campaign = document.campaign
    means = planned_means(document, sessions)
    builder = ModelBuilder()
    reference = campaign.site(campaign.head.reference_site)
    add_known_number(
        builder,
        reference.id,
        reference.geopotential_number or 0.0,
        reference.u_geopotential_number,
    )
    priors = {
        RatioError.between(one.numerator, one.denominator): RatioPrior(one.u)
        for one in campaign.nominal_ratios
    }
    nothing = np.zeros((len(means), len(means)))
    add_session_rows(builder, means, nothing, tide_system=campaign.head.tide_system, ratios=priors)
    rows = _network(builder, document)
    scale = potential_from_shift(1.0) ** 2
    parts = {name: scale * part for name, part in noise_parts(campaign, sessions).items()}
    gravity = {} if rows is None else {name: one.gravity for name, one in rows.datums.items()}
    return PlanModel(campaign, tuple(sessions), tuple(means), builder.build(), parts, gravity)


def _network(builder: ModelBuilder, document: Document) -> NetworkRows | None:
    """Rows of the network tables, where a target is an offset of datums; else it is `level`'s."""
    target = document.campaign.target
    return add_network(builder, document) if target is not None and target.offsets else None


def planned_means(document: Document, sessions: Sequence[Session]) -> list[SessionMean]:
    """What the linear model needs of sessions that have not happened; y is zero."""
    campaign = document.campaign
    means = []
    for session in sessions:
        start, stop = window_of(session)
        epochs = np.arange(start, stop, _TIDE_STEP_NS)
        tide = tide_of(campaign, session, epochs, folder=document.folder)
        means.append(
            SessionMean(
                id=session.id,
                numerator=campaign.clock(session.numerator.clock),
                numerator_site=campaign.site(session.numerator.site),
                denominator=campaign.clock(session.denominator.clock),
                denominator_site=campaign.site(session.denominator.site),
                links=tuple(campaign.link(link) for link in session.links),
                start_ns=start,
                y=0.0,
                u_tide=tide.u,
                years=years_from_epoch(campaign, (start + stop) // 2),
            )
        )
    return means


def goals_of(model: PlanModel) -> list[Goal]:
    """Turn the document's targets into combinations of unknowns.

    Raises
    ------
    DataError
        If nothing in the plan sees a site or datum of a target.
    """
    goals = list(_goals(model))
    known = set(model.others.unknowns)
    for goal in goals:
        for name, end in zip(goal.combination, (goal.end, goal.start), strict=True):
            if name not in known:
                raise DataError(
                    f"no planned session goes to {end}",
                    where=f"target {goal.name}",
                    advice="Add a session or a candidate there, or leave the target out",
                )
    return goals


def _goals(model: PlanModel) -> Iterator[Goal]:
    campaign, target = model.campaign, model.campaign.target
    for one in target.differences if target else ():
        site = campaign.site(one.to_site)
        gravity = float(normal_gravity(site.latitude, site.ellipsoidal_height or 0.0))
        ends: dict[Hashable, float] = {
            NumberOf(one.to_site): 1.0 / gravity,
            NumberOf(one.from_site): -1.0 / gravity,
        }
        yield Goal("height_difference", one.from_site, one.to_site, one.u_height, ends, gravity)
    for offset in target.offsets if target else ():
        first, second = offset.from_datum, offset.to_datum
        at_first, at_second = (model.datum_gravity[name] for name in (first, second))
        terms: dict[Hashable, float] = {
            DatumTerm(second, "offset"): 1.0 / at_second,
            DatumTerm(first, "offset"): -1.0 / at_first,
        }
        yield Goal("datum_offset", first, second, offset.u, terms, at_second)
