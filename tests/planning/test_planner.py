"""Whole plans: candidates to sessions, costs, notes; and what simulation says of them."""

from __future__ import annotations

import tomllib

import pytest

from clockgeo.campaign import read_document
from clockgeo.campaign.schema import Session
from clockgeo.errors import DataError
from clockgeo.levelling.stations import Clock, Link
from clockgeo.planning import PlanResult, confirm, goals_of, plan, plan_model
from clockgeo.planning.output import sessions_toml, write_plan
from clockgeo.planning.presets import PRESETS, find_preset, preset_toml
from clockgeo.planning.schedule import stays_in, total_cost
from invented_plan import START, plan_document, session

CLOCK = {
    "instability": {"white_fm": 4e-16},
    "effect": [{"name": "stay", "u": 1e-18, "renewed": "stay"}, {"name": "constant", "u": 8e-18}],
}


def candidate(name, site, **more):
    return {
        "id": name,
        "numerator": {"clock": "a", "site": site},
        "denominator": {"clock": "b", "site": "home"},
        **more,
    }


@pytest.fixture
def home(tmp_path):
    """Writes a document, so that its checksum can be taken; returns it with tables replaced."""

    def made(sessions=(), **tables):
        document = plan_document(sessions, folder=tmp_path, **tables)
        document.path.write_text("", encoding="utf-8")
        return document

    return made


def shared_out(home, **plan_table):
    return plan(
        home(
            a=CLOCK,
            b={"transition": "171Yb"},
            candidate=[candidate("l", "home"), candidate("r", "away")],
            plan={"days": 10.0, "start": START, "move_days": 2.0, **plan_table},
        )
    )


def test_two_candidates_share_evenly(home):
    # u² = σ²/τ_l + σ²/τ_r + const: least for equal times.
    planned = shared_out(home)
    optimum = planned.result.optimum
    assert [one.optimal_days for one in optimum.shares] == pytest.approx([5.0, 5.0], abs=1e-3)
    assert [one.days for one in optimum.shares] == [5.0, 5.0]
    assert optimum.certificate_gap < 1e-8
    assert optimum.rounding_gap < 1e-6
    rounding = 1.0 + 1e-12
    assert optimum.bound <= optimum.value * rounding
    assert optimum.bound <= optimum.rounded_value * rounding
    assert [one.id for one in planned.result.sessions] == ["l", "r"]
    assert planned.result.sessions[1].start == "2028-01-08T00:00:00Z"  # 5 d, and 2 d on the way


def test_the_optimum_predicts_what_the_plan_predicts(home):
    # The value of the problem of design is the u of the plan's own model, slow noise aside.
    planned = shared_out(home)
    target = planned.result.targets[0]
    ratio = target.predicted_u / target.required_u
    assert planned.result.optimum.rounded_value == pytest.approx(ratio, rel=1e-6)


def test_steps_and_least_days(home):
    planned = shared_out(home, step=4.0)
    assert sum(one.days for one in planned.result.optimum.shares) == 8.0
    document = home(
        a=CLOCK,
        b={"transition": "171Yb"},
        candidate=[candidate("l", "home", least_days=7.0), candidate("r", "away", most_days=2.0)],
        plan={"days": 10.0, "start": START},
    )
    shares = {one.id: one.days for one in plan(document).result.optimum.shares}
    assert shares == {"l": 8.0, "r": 2.0}


def test_what_was_left_out_is_tried(home):
    document = home(
        a=CLOCK,
        b={"transition": "171Yb"},
        candidate=[
            candidate("l", "home"),
            candidate("r", "away"),
            candidate("dull", "home", uptime=0.001, most_days=2.0),
        ],
        plan={"days": 4.0, "start": START},
    )
    result = plan(document).result
    assert "dull" not in {one.id for one in result.sessions}
    tried = {one.change: one for one in result.sensitivity}
    assert tried["1 d of dull, so far left out"].gain >= 0.0
    assert tried["1 d of dull, so far left out"].gain < tried["a day more in r"].gain


def test_a_candidate_without_noise_is_refused(home):
    document = home(
        candidate=[candidate("l", "home"), candidate("r", "away")],
        plan={"days": 4.0, "start": START},
    )
    with pytest.raises(DataError, match="without white noise need no time"):
        plan(document)


def test_a_budget_with_moves(home):
    # 10 a move, 1 a day and 20 in all leave ten days for two sessions with one move between.
    document = home(
        a=CLOCK,
        b={"transition": "171Yb"},
        candidate=[candidate("l", "home"), candidate("r", "away")],
        plan={"start": START, "costs": {"day": 1.0, "move": 10.0, "unit": "shells"}},
        target={
            "difference": [{"from": "home", "to": "away", "u_height": 0.1}],
            "budget": 20.0,
        },
    )
    costs = plan(document).result.costs
    assert (costs.days, costs.moves, costs.total, costs.unit) == (10.0, 1, 20.0, "shells")
    assert costs.within_budget


def test_costs_by_hand():
    sessions = [session("l", "home", 0, 1), session("r", "away", 3, 2), session("l2", "home", 7, 1)]
    document = plan_document(sessions, plan={"costs": {"day": 2.0, "move": 5.0, "kilometre": 0.01}})
    stays = stays_in(document.campaign, document.campaign.sessions)
    moved = [one for one in stays if one.moved]
    assert [(one.clock, one.site) for one in stays] == [
        ("a", "home"),
        ("a", "away"),
        ("a", "home"),
        ("b", "home"),
    ]
    kilometres = sum(one.distance for one in moved) / 1e3
    assert 2 * 130.0 < kilometres < 2 * 135.0  # 1° north and 1° east at 50°: about 132 km
    expected = 2.0 * 4.0 + 5.0 * 2 + 0.01 * kilometres
    assert total_cost(document.campaign, 4.0, stays) == pytest.approx(expected)


def test_a_late_or_dear_plan_says_so(home):
    target = {
        "difference": [{"from": "home", "to": "away", "u_height": 0.1}],
        "deadline": "2028-01-02T00:00:00Z",
        "budget": 3.0,
    }
    document = home(
        [session("r", "away", 0, 4)], a=CLOCK, target=target, plan={"costs": {"day": 1.0}}
    )
    result = plan(document).result
    assert result.costs.within_deadline is False
    assert "after the deadline" in result.notes[0]
    assert "more than the 3 allowed" in result.notes[1]


def test_sessions_go_back_into_the_document(home, tmp_path):
    planned = shared_out(home)
    tables = tomllib.loads(sessions_toml(planned.sessions))["session"]
    assert tuple(Session.model_validate(one) for one in tables) == planned.sessions
    paths = write_plan(planned.result, planned.sessions, tmp_path)
    again = PlanResult.model_validate_json(paths[0].read_text(encoding="utf-8"))
    assert again == planned.result


def test_what_is_not_connected_is_said(home):
    document = home(
        [session("l", "home", 0, 1)],
        a=CLOCK,
        target={"difference": [{"from": "home", "to": "away", "u_height": 0.1}]},
    )
    with pytest.raises(DataError, match="no planned session goes to away"):
        plan(document)


@pytest.mark.parametrize("name", PRESETS)
def test_presets_are_tables_of_the_document(name):
    preset = find_preset(name)
    table = tomllib.loads(preset_toml(preset))[preset.kind][0]
    made = (Clock if preset.kind == "clock" else Link).model_validate(table)
    total = sum(effect.u**2 for effect in made.effects) ** 0.5
    assert total == pytest.approx(preset.u, rel=0.02)
    assert made.instability == preset.instability
    assert preset.source


def test_an_unknown_preset_is_refused():
    with pytest.raises(DataError, match="there is no such preset: sundial"):
        find_preset("sundial")


TRUTH = {"geopotential_numbers": {"home": 0.0, "away": 120.0}, "interval": 240.0}


def confirmed(runs, **truth):
    document = plan_document(
        [session("r1", "away", 0, 0.5), session("r2", "away", 0.6, 0.5)],
        a=CLOCK,
        truth={**TRUTH, **truth},
        head={"scatter": "none"},
    )
    prediction = plan_model(document, document.campaign.sessions).solve()
    goals = goals_of(prediction.model)
    return confirm(document, prediction, goals, runs=runs, seed=4).result.targets[0]


def test_simulated_campaigns_confirm_the_prediction():
    one = confirmed(24)
    assert one.agrees
    assert one.lower < one.predicted_u < one.upper
    assert one.stated_u == pytest.approx(one.predicted_u, rel=0.1)


def test_simulated_campaigns_can_contradict():
    # Offsets of 5e-17 a session that the plan knows nothing of.
    one = confirmed(8, session_scatter=5e-17)
    assert not one.agrees
    assert one.realised_u > 3.0 * one.predicted_u


def test_without_truth_there_is_nothing_to_confirm(project):
    document = read_document(project / "examples" / "harrow-line" / "campaign.toml")
    bare = type(document)(document.campaign.model_copy(update={"truth": None}), document.path)
    prediction = plan_model(bare, bare.campaign.sessions).solve()
    with pytest.raises(DataError, match=r"confirmed against a \[truth\]"):
        confirm(bare, prediction, goals_of(prediction.model), runs=2)
