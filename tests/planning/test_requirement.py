"""What it takes to reach a target, proved by doing it."""

from __future__ import annotations

import pytest

from checks import assert_published
from clockgeo.frequency import NoiseModel
from clockgeo.planning import averaging_time, goals_of, plan_model
from clockgeo.planning.limits import words_of
from clockgeo.planning.requirement import need_of
from invented_plan import plan_document, session

STAY = {"name": "black body", "u": 4e-18, "renewed": "stay"}
COMMON = {"name": "lattice light", "u": 4e-18}


def found(document):
    model = plan_model(document, document.campaign.sessions)
    prediction = model.solve()
    goal = goals_of(model)[0]
    return need_of(prediction, goal), prediction


# τ = (σ₁/u)², the rule for white frequency noise (digest of methods, 3.1).
@pytest.mark.parametrize(
    ("sigma", "u", "hours"),
    [(5e-16, 1e-18, "69.4"), (1e-16, 1e-18, "2.8"), (1.3e-15, 1e-17, "4.7")],
)
def test_white_noise_rule(sigma, u, hours):
    time = averaging_time(NoiseModel(white_fm=sigma), u)
    assert_published(time / 3600.0, hours)
    # The whole plan says the same: one day of such a clock has to become that many hours.
    gravity = 9.81
    document = plan_document(
        [session("s", "away", 0, 1)],
        a={"instability": {"white_fm": sigma}},
        u_height=u * 299_792_458.0**2 / gravity,
    )
    need, _ = found(document)
    assert need.time_factor * 24.0 == pytest.approx(time / 3600.0, rel=1e-3)  # gravity of the place


def test_a_floor_leaves_less_room():
    assert averaging_time(NoiseModel(white_fm=1e-16, flicker_fm=8e-19), 1e-18) == pytest.approx(
        1e-32 / (1e-36 - 0.64e-36)
    )
    assert averaging_time(NoiseModel(white_fm=1e-16, flicker_fm=1e-18), 1e-18) is None


def test_the_time_factor_reaches_the_target():
    clock = {"instability": {"white_fm": 9e-16}, "effect": [STAY]}
    need, _ = found(plan_document([session("s", "away", 0, 1)], a=clock, u_height=0.04))
    assert not need.reached
    again, _ = found(
        plan_document([session("s", "away", 0, need.time_factor)], a=clock, u_height=0.04)
    )
    assert again.predicted_u == pytest.approx(0.04, rel=1e-5)
    quieter = {**clock, "instability": {"white_fm": 9e-16 * need.stability_factor}}
    again, _ = found(plan_document([session("s", "away", 0, 1)], a=quieter, u_height=0.04))
    assert again.predicted_u == pytest.approx(0.04, rel=1e-5)


def test_the_uptime_factor_reaches_the_target():
    clock = {"instability": {"white_fm": 9e-16}}
    one = session("s", "away", 0, 2, uptime=0.5)
    need, _ = found(plan_document([one], a=clock, u_height=0.025))
    assert not need.reached
    one["uptime"] = 0.5 * need.uptime_factor
    again, _ = found(plan_document([one], a=clock, u_height=0.025))
    assert again.predicted_u == pytest.approx(0.025, rel=1e-3)  # uptime in whole samples
    assert found(plan_document([one], a=clock, u_height=0.01))[0].uptime_factor is None


def test_the_effect_factor_reaches_the_target():
    clock = {"instability": {"white_fm": 2e-16}, "effect": [COMMON]}
    one = [session("s", "away", 0, 1)]
    need, _ = found(plan_document(one, a=clock, u_height=0.02))
    largest = need.effects[0]
    assert (largest.owner, largest.name, largest.term) == (
        "a",
        "lattice light",
        "effects of clocks",
    )
    assert largest.u == pytest.approx(4e-18)
    clock["effect"] = [{**COMMON, "u": 4e-18 * largest.factor}]
    again, _ = found(plan_document(one, a=clock, u_height=0.02))
    assert again.predicted_u == pytest.approx(0.02, rel=1e-5)


def test_what_cannot_be_reached_is_said_in_words():
    clock = {"instability": {"white_fm": 2e-16}, "effect": [COMMON]}
    need, prediction = found(plan_document([session("s", "away", 0, 1)], a=clock, u_height=0.03))
    assert need.time_factor is None
    text = words_of(need, prediction)
    assert text.startswith("Cannot be reached by longer sessions")
    assert "common effect a · lattice light of 4e-18 does not average" in text
    assert "halve it or calibrate twice" in text
    # ... and halving it does.
    clock["effect"] = [{**COMMON, "u": 2e-18}]
    halved, _ = found(plan_document([session("s", "away", 0, 1)], a=clock, u_height=0.03))
    assert halved.reached


def test_a_stay_that_limits_is_called_so():
    clock = {"instability": {"white_fm": 2e-16}, "effect": [STAY]}
    need, prediction = found(plan_document([session("s", "away", 0, 1)], a=clock, u_height=0.03))
    assert "reproducibility of each stay a · black body" in words_of(need, prediction)
    assert "stay twice" in words_of(need, prediction)


def test_a_flicker_floor_alone_is_called_so():
    clock = {"instability": {"white_fm": 1e-16, "flicker_fm": 5e-18}}
    need, prediction = found(plan_document([session("s", "away", 0, 5)], a=clock, u_height=0.02))
    assert need.time_factor is None
    assert "flicker floor" in words_of(need, prediction)


def test_two_large_effects_are_not_blamed_on_one():
    clock = {"instability": {"white_fm": 1e-16}, "effect": [COMMON, STAY]}
    need, prediction = found(plan_document([session("s", "away", 0, 5)], a=clock, u_height=0.02))
    assert need.effects[0].factor is None
    assert "even without it the target is missed" in words_of(need, prediction)


def test_what_time_can_do_is_said_in_days():
    clock = {"instability": {"white_fm": 9e-16}}
    need, prediction = found(plan_document([session("s", "away", 0, 1)], a=clock, u_height=0.014))
    text = words_of(need, prediction)
    assert text.startswith("Not reached")
    assert f"{need.time_factor:.1f} d in all, now 1.0 d" in text
