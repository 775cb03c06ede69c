"""From an adjustment to the tables of observations, tests, components and what cannot be told."""

from __future__ import annotations

from collections.abc import Hashable, Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.adjust_results import (
    BlunderResult,
    ComponentResult,
    GlobalTest,
    IdentifiabilityResult,
    LoopResult,
    ObservationResult,
    ParameterShare,
    RobustResult,
    SuspectResult,
)
from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.levelling.solution import Fit
from clockgeo.network.adjustment import Adjustment
from clockgeo.network.blunders import BlunderSearch
from clockgeo.network.critical_values import detectable_shift, global_limits
from clockgeo.network.loops import loop_misclosures
from clockgeo.network.reliability import Reliability
from clockgeo.network.robust import Rule, adjust_robustly
from clockgeo.network.unknowns import DatumTerm
from clockgeo.network.variance_components import Component, variance_components
from clockgeo.network.zero_definition import ZeroRule

__all__ = [
    "blunder_result",
    "component_results",
    "global_test",
    "identifiability_result",
    "loop_results",
    "observation_results",
    "robust_result",
]

_CHUNK = 256
_EFFECTS_UP_TO = 5000
"""Observations up to which the effect of each one's minimal detectable bias is worked out."""
_LEAST_REDUNDANCY = 3.0
"""Redundancy that a group needs before its variance is estimated."""
_LOOPS = 20


def global_test(fit: Fit) -> GlobalTest:
    """Two-sided 95 % test of the variance factor."""
    freedom = fit.degrees_of_freedom
    lower, upper = global_limits(freedom) if freedom > 0 else (None, None)
    passed = None
    if lower is not None and upper is not None:
        passed = lower <= fit.chi_squared / freedom <= upper
    return GlobalTest(
        chi_squared=fit.chi_squared,
        degrees_of_freedom=freedom,
        p_value=fit.p_value,
        lower=lower,
        upper=upper,
        passed=passed,
    )


def observation_results(
    reliability: Reliability, groups: Mapping[str, Sequence[str]]
) -> Iterator[ObservationResult]:
    """Every observation after adjustment, with its control by the others."""
    adjustment = reliability.adjustment
    model = adjustment.model
    group_of = {row: group for group, rows in groups.items() for row in rows}
    variance = model.noise.diagonal() + _squares(model.loading)
    external = _external_reliability(reliability)
    largest, culprit = _largest_effects(reliability)
    bias = reliability.minimal_detectable_bias
    for place, row in enumerate(model.rows):
        kind = model.kinds[place]
        yield ObservationResult(
            id=row,
            kind=kind,
            group=group_of.get(row, f"{kind} rows"),
            points=_points_of(model, place),
            value=float(model.values[place]),
            u=float(np.sqrt(variance[place])),
            residual=float(adjustment.residuals[place]),
            standardised=_finite(reliability.standardised[place]),
            redundancy=float(reliability.redundancy[place]),
            minimal_detectable_bias=_finite(bias[place]),
            external_reliability=_finite(external[place]),
            largest_effect=_finite(largest[place]),
            largest_effect_on=culprit[place],
        )


def _squares(loading: object) -> NDArray[np.float64]:
    return np.asarray(loading.multiply(loading).sum(axis=1)).ravel()  # type: ignore[attr-defined]


def _finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _points_of(model: LinearModel, row: int) -> tuple[str, ...]:
    entries = slice(model.design.indptr[row], model.design.indptr[row + 1])
    names = (model.unknowns[column] for column in model.design.indices[entries])
    return tuple(name.site for name in names if isinstance(name, NumberOf))


def _external_reliability(reliability: Reliability) -> NDArray[np.float64]:
    """δ0 √((P_ii - M_ii)/M_ii): effect of the bias on any combination, in units of its u."""
    weight = _squares(reliability.adjustment.system.whitener.T)
    found = np.full(weight.size, np.inf)
    here = reliability.controlled
    share = np.maximum(weight[here] / reliability.sharpness[here] - 1.0, 0.0)
    shift = detectable_shift(alpha=reliability.alpha, power=reliability.power)
    found[here] = shift * np.sqrt(share)
    return found


def _largest_effects(reliability: Reliability) -> tuple[NDArray[np.float64], list[str | None]]:
    """Largest change of a number or offset by each row's minimal detectable bias."""
    adjustment = reliability.adjustment
    size = len(adjustment.model.rows)
    largest, culprit = np.full(size, np.nan), [None] * size
    wanted = np.array(
        [
            isinstance(name, NumberOf) or (isinstance(name, DatumTerm) and name.term == "offset")
            for name in adjustment.model.unknowns
        ]
    )
    wanted &= np.isfinite(adjustment.estimate)
    names = [str(name) for name in adjustment.model.unknowns]
    rows = np.flatnonzero(reliability.controlled)
    if size > _EFFECTS_UP_TO or not wanted.any():
        return largest, list(culprit)
    told: list[str | None] = list(culprit)
    places = np.flatnonzero(wanted)
    for start in range(0, rows.size, _CHUNK):
        chunk = rows[start : start + _CHUNK]
        bias = reliability.minimal_detectable_bias[chunk]
        effect = np.abs(reliability.effect_of_bias(chunk, bias)[places])
        where = np.argmax(effect, axis=0)
        largest[chunk] = effect[where, np.arange(chunk.size)]
        for row, place in zip(chunk, where, strict=True):
            told[row] = names[places[place]]
    return largest, told


def component_results(
    reliability: Reliability, groups: Mapping[str, Sequence[str]], without: Sequence[str]
) -> tuple[tuple[ComponentResult, ...], list[str]]:
    """Variance factor of every group that is controlled well enough, and notes on the others.

    Parameters
    ----------
    reliability : Reliability
    groups : mapping
        Group -> ids of its rows.
    without : sequence of str
        Suspected rows; they would speak for themselves only and are left out.
    """
    whole = reliability.adjustment.model
    place = {row: i for i, row in enumerate(whole.rows)}
    model = whole.without(without)
    fresh = {row: i for i, row in enumerate(model.rows)}
    components, weak = [], []
    for group, rows in groups.items():
        kept = [row for row in rows if row in fresh]
        share = sum(reliability.redundancy[place[row]] for row in kept)
        if share < _LEAST_REDUNDANCY:
            weak.append(group)
            continue
        members = np.array([fresh[row] for row in kept], dtype=np.int64)
        components.append(Component(group, members, np.array([], dtype=np.int64)))
    notes = [f"no variance factor of {group}: too little redundancy" for group in weak]
    if not components:
        return (), notes
    try:
        estimates = variance_components(model, components)
    except DataError as error:
        return (), [*notes, f"no variance factors: {error}"]
    notes += [
        f"the variance factor of {one.name} would fall below zero and stays at zero"
        for one in estimates
        if one.at_zero
    ]
    results = tuple(
        ComponentResult(
            group=one.name,
            observations=component.rows.size,
            factor=one.factor,
            u=one.u,
            redundancy=one.redundancy,
        )
        for one, component in zip(estimates, components, strict=True)
    )
    return results, notes


def identifiability_result(
    adjustment: Adjustment, reliability: Reliability
) -> IdentifiabilityResult:
    """What the observations determine, and what each parameter owes to prior knowledge."""
    model, known = adjustment.model, adjustment.identifiability
    exact = set(adjustment.system.exact.tolist())
    uncontrolled = tuple(
        row
        for place, row in enumerate(model.rows)
        if not reliability.controlled[place]
        and place not in exact
        and model.kinds[place] not in ("prior", "known")
    )
    return IdentifiabilityResult(
        unknowns=known.unknowns,
        rank=known.rank,
        gaps=tuple(gap.text for gap in known.gaps),
        uncontrolled=uncontrolled,
        shares=(*_parameter_shares(adjustment), *_effect_shares(adjustment)),
    )


def _parameter_shares(adjustment: Adjustment) -> Iterator[ParameterShare]:
    """Parameters beside the numbers: part of the estimate that hangs on prior rows."""
    model = adjustment.model
    prior = np.array(model.kinds) == "prior"
    for place, name in enumerate(model.unknowns):
        if isinstance(name, NumberOf):
            continue
        estimable = bool(np.isfinite(adjustment.estimate[place]))
        share = _prior_share(adjustment, name, place, prior) if estimable else 0.0
        yield ParameterShare(
            parameter=str(name),
            estimable=estimable,
            prior_share=share,
            data_share=1.0 - share if estimable else 0.0,
        )


def _prior_share(
    adjustment: Adjustment, name: Hashable, place: int, prior: NDArray[np.bool_]
) -> float:
    if not prior.any():
        return 0.0
    gain = adjustment.gain({name: 1.0})
    column = adjustment.model.design[:, [place]].toarray().ravel()
    return float(np.clip(gain[prior] @ column[prior], 0.0, 1.0))


def _effect_shares(adjustment: Adjustment) -> Iterator[ParameterShare]:
    """Effects that several rows feel: variance that is left of the unit prior."""
    system = adjustment.system
    left = adjustment.normals.diagonal()[system.free.size :]
    for effect, variance in zip(system.common, left, strict=True):
        share = float(np.clip(variance, 0.0, 1.0))
        yield ParameterShare(
            parameter=str(adjustment.model.effects[effect]),
            estimable=True,
            prior_share=share,
            data_share=1.0 - share,
        )


def blunder_result(search: BlunderSearch) -> BlunderResult:
    """Return the search for blunders as it stands in the result."""
    return BlunderResult(
        limit=search.limit,
        suspects=tuple(
            SuspectResult(
                id=one.row,
                bias=one.bias,
                u=one.u_bias,
                standardised=one.standardised,
                alternatives=one.alternatives,
            )
            for one in search.suspects
        ),
        chi_squared=search.chi_squared,
        degrees_of_freedom=search.degrees_of_freedom,
        p_value=search.p_value,
        text=search.text,
    )


def loop_results(model: LinearModel) -> Iterator[LoopResult]:
    """Return the loops of levelled lines that close worst."""
    for loop in loop_misclosures(model)[:_LOOPS]:
        yield LoopResult(
            observations=loop.rows,
            signs=loop.signs,
            misclosure=loop.misclosure,
            u=loop.u,
            standardised=float(loop.standardised),
        )


def robust_result(
    adjustment: Adjustment, rule: Rule | str, zero: ZeroRule | None
) -> RobustResult | None:
    """Return the robust adjustment beside the plain one, if it is asked for."""
    if rule not in ("huber", "igg3"):
        return None
    kind: Rule = "huber" if rule == "huber" else "igg3"
    robust = adjust_robustly(adjustment.model, rule=kind, zero=zero)
    numbers = np.array([isinstance(name, NumberOf) for name in adjustment.model.unknowns])
    change = np.where(numbers, robust.adjustment.estimate - adjustment.estimate, 0.0)
    place = int(np.nanargmax(np.abs(change)))
    point = adjustment.model.unknowns[place]
    factors = zip(adjustment.model.rows, robust.factors, strict=True)
    return RobustResult(
        rule=kind,
        scale=robust.scale,
        down_weighted={row: float(factor) for row, factor in factors if factor < 0.999},
        largest_change=float(change[place]),
        at_point=point.site if isinstance(point, NumberOf) else str(point),
    )
