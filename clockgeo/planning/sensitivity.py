"""What helps most: which u to halve, where to stay longer, which visit to repeat."""

from __future__ import annotations

from collections.abc import Hashable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from clockgeo.levelling.effects import EffectKey
from clockgeo.levelling.session_rows import stays_of
from clockgeo.planning.noise import AVERAGING
from clockgeo.planning.prediction import Goal, PlanModel, Prediction
from clockgeo.planning.requirement import effect_lines

__all__ = ["Change", "changes", "visited_again", "with_more_time"]

_DAY_S = 86_400.0
_HALVED = 8
"""So many of the largest effects are tried."""
_HARMLESS = 1e-6
"""Share of the variance below which an effect is not worth a try."""
_SESSIONS = 40
"""Up to so many kinds of session are tried; beyond, those that weigh most."""


@dataclass(frozen=True)
class Change:
    """One change and the u of every goal with it, m."""

    text: str
    u: tuple[float, ...]


def changes(
    prediction: Prediction, goals: Sequence[Goal], others: Mapping[str, PlanModel] | None = None
) -> Iterator[Change]:
    """Try changes of the plan one at a time.

    Parameters
    ----------
    prediction : Prediction
    goals : sequence of Goal
    others : mapping of str to PlanModel, optional
        Further changes by their names, such as a day at a site that the plan leaves out.

    Yields
    ------
    Change
        The largest effects halved; a day more for a session; a session once more, as a new stay of
        the clocks that travel; and the further ones.
    """
    model = prediction.model
    lines = effect_lines(model)
    parts = {
        effect: sum(one.u**2 for one in contributions)
        for effect, contributions in _by_effect(prediction, goals).items()
    }
    weight = {line: sum(parts[effect] for effect in lines[line]) for line in lines}
    whole = sum((prediction.u(goal) / goal.required_u) ** 2 for goal in goals)
    for line in sorted(lines, key=lambda one: -weight[one])[:_HALVED]:
        if weight[line] > _HARMLESS * whole:
            halved = model.with_effects(dict.fromkeys(lines[line], 0.5))
            name = " · ".join(part for part in line if part)
            yield _change(f"halve u of {name}", halved, goals)
    for place in _weightiest(prediction, goals):
        name = model.sessions[place].id
        yield _change(f"a day more in {name}", with_more_time(model, place, _DAY_S), goals)
        yield _change(f"{name} once more, as a new stay", visited_again(model, place), goals)
    for text, other in (others or {}).items():
        yield _change(text, other, goals)


def _by_effect(prediction: Prediction, goals: Sequence[Goal]) -> dict[Hashable, list[_Part]]:
    found: dict[Hashable, list[_Part]] = {}
    for goal in goals:
        for one in prediction.solution.contributions(goal.combination):
            found.setdefault(one.effect, []).append(_Part(one.u / goal.required_u))
    return found


@dataclass(frozen=True)
class _Part:
    u: float


def _weightiest(prediction: Prediction, goals: Sequence[Goal]) -> list[int]:
    """The session that weighs most of each kind: same clocks, links and stays."""
    solution, model = prediction.solution, prediction.model
    weights = np.array([solution.weights(g.combination) @ solution.gain for g in goals])
    size = np.max(np.abs(weights[:, model.clock_rows]), axis=0)
    stays = stays_of(model.means)
    best: dict[Hashable, int] = {}
    for place in np.argsort(-size, kind="stable").tolist():
        session = model.sessions[place]
        at = tuple((one, stays[one.clock, session.id]) for one in session.places)
        best.setdefault((at, session.links), place)
    return sorted(list(best.values())[:_SESSIONS])


def _change(text: str, model: PlanModel, goals: Sequence[Goal]) -> Change:
    solved = model.solve()
    return Change(text, tuple(solved.u(goal) for goal in goals))


def with_more_time(model: PlanModel, place: int, seconds: float) -> PlanModel:
    """Return the model with one session longer; its white noise falls, its slow noise stays."""
    length = model.sessions[place].planned_seconds or _DAY_S
    scale = np.ones(len(model.sessions))
    scale[place] = (length / (length + seconds)) ** 0.5
    shape = np.outer(scale, scale)
    return model.with_noise({name: model.parts[name] * shape for name in AVERAGING})


def visited_again(model: PlanModel, place: int) -> PlanModel:
    """Return the model with one session repeated under the same circumstances.

    The new session has noise of its own. Effects that are renewed at each session, and those
    renewed at each stay of a clock that travels, are new variables; all others are the same.
    """
    others, row = model.others, int(model.clock_rows[place])
    session, mean = model.sessions[place], model.means[place]
    travellers = _travellers(model)
    new_id = f"{session.id} (again)"
    loads = others.loading.tocsr()[[row]].tocoo()
    effects = list(others.effects)
    columns = []
    for column in loads.coords[1].tolist():
        effect = effects[column]
        if isinstance(effect, EffectKey) and _is_new(effect, session.id, travellers):
            effects.append(replace(effect, occasion=f"{effect.occasion} (again)"))
            column = len(effects) - 1
        columns.append(column)
    size = len(others.rows)
    beside = sparse.csr_array((size, len(effects) - len(others.effects)))
    widened = sparse.hstack([others.loading, beside])
    added = sparse.csr_array(
        (loads.data, (np.zeros(len(columns), dtype=int), columns)), shape=(1, len(effects))
    )
    extended = replace(
        others,
        effects=tuple(effects),
        rows=(*others.rows, new_id),
        kinds=(*others.kinds, others.kinds[row]),
        values=np.append(others.values, others.values[row]),
        design=sparse.csr_array(sparse.vstack([others.design, others.design[[row]]])),
        loading=sparse.csr_array(sparse.vstack([widened, added])),
        noise=sparse.csr_array(sparse.block_diag([others.noise, sparse.csr_array((1, 1))])),
    )
    parts = {}
    for name, part in model.parts.items():
        parts[name] = np.pad(part, (0, 1))
        parts[name][-1, -1] = part[place, place]
    return PlanModel(
        campaign=model.campaign,
        sessions=(*model.sessions, session.model_copy(update={"id": new_id})),
        means=(*model.means, replace(mean, id=new_id)),
        others=extended,
        parts=parts,
        datum_gravity=model.datum_gravity,
    )


def _travellers(model: PlanModel) -> set[str]:
    """Clocks that stand at more than one site."""
    sites: dict[str, set[str]] = {}
    for session in model.sessions:
        for placed in session.places:
            sites.setdefault(placed.clock, set()).add(placed.site)
    return {clock for clock, places in sites.items() if len(places) > 1}


def _is_new(effect: EffectKey, session: str, travellers: set[str]) -> bool:
    if effect.occasion.startswith("stay "):
        return effect.owner in travellers
    return effect.occasion == session
