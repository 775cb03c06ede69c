"""Predicted u against published values and against sums done by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from checks import assert_close, assert_published
from clockgeo.campaign import level, read_document
from clockgeo.planning import goals_of, plan_model
from clockgeo.planning.noise import DEAD_TIME, FLICKER, STATISTICS
from clockgeo.planning.prediction import EFFECTS, STAYS
from invented_plan import C_SQUARED, in_frequency, plan_document, session

YB = {"transition": "171Yb"}


def predicted(document):
    model = plan_model(document, document.campaign.sessions)
    return model.solve(), goals_of(model)[0]


def u_of(document):
    """Predicted u of the first target, fractional."""
    return in_frequency(*predicted(document))


def test_contrast_under_flicker_noise():
    # Local 5 d, gap 2 d, remote 5 d, gap 2 d, local 5 d under a flicker floor of 1e-17: the remote
    # minus the mean of both local means has 1.2930e-17 (digest of methods, 4.4, computed there by
    # the generalised covariance). By symmetry that is the best estimate when the ratio is unknown.
    sessions = [
        session("l1", "home", 0, 5),
        session("r", "away", 7, 5),
        session("l2", "home", 14, 5),
    ]
    noise = {"instability": {"flicker_fm": 1e-17}}
    assert_published(1e17 * u_of(plan_document(sessions, a=noise, b=YB)), "1.2930")
    # Remote minus the first local alone: 1.6063e-17.
    assert_published(1e17 * u_of(plan_document(sessions[:2], a=noise, b=YB)), "1.6063")


def test_fifteen_daily_sessions():
    # The same source: 15 sessions of 0.6 d, 5 local, 5 remote, 5 local, gaps of 2 d, 1e-15 at 1 s.
    places = [("home", 0), ("away", 7), ("home", 14)]
    sessions = [
        session(f"{site} {first + day}", site, first + day, 0.6)
        for site, first in places
        for day in range(5)
    ]
    noise = {"instability": {"white_fm": 1e-15, "flicker_fm": 5e-18}}
    assert_published(1e18 * u_of(plan_document(sessions, a=noise, b=YB)), "6.880")
    white = {"instability": {"white_fm": 1e-15}}
    assert_published(1e18 * u_of(plan_document(sessions, a=white, b=YB)), "2.41")


def test_white_noise_by_hand():
    # σ²/(T·uptime) for one session: 5e-16 and 2e-16 at 1 s, two days, uptime 0.4.
    one = [session("s", "away", 0, 2, uptime=0.4)]
    clocks = ({"instability": {"white_fm": 5e-16}}, {"instability": {"white_fm": 2e-16}})
    prediction, goal = predicted(plan_document(one, a=clocks[0], b=clocks[1]))
    variance = (5e-16**2 + 2e-16**2) / 172_800.0
    # The uptime is kept to one sample of a minute: 1e-4 of 2880.
    assert in_frequency(prediction, goal) == pytest.approx((variance / 0.4) ** 0.5, rel=1e-3)
    terms = {k: v * goal.gravity / C_SQUARED for k, v in prediction.terms(goal).items()}
    assert terms[STATISTICS] == pytest.approx(variance**0.5, rel=1e-6)
    assert terms[DEAD_TIME] == pytest.approx((variance * 1.5) ** 0.5, rel=1e-3)


def effect(name, u, renewed="never", **more):
    return {"name": name, "u": u, "renewed": renewed, **more}


def test_local_calibration_by_hand():
    # u² of remote minus local: what renews at a stay counts at both, what is constant cancels,
    # what renews at a session counts at each (common practice of transported clocks).
    effects = [
        effect("constant", 9e-18),
        effect("stay", 2e-18, "stay"),
        effect("session", 1e-18, "session"),
    ]
    sessions = [session("l", "home", 0, 1), session("r", "away", 3, 1)]
    clock = {"effect": effects, "instability": {"white_fm": 1e-18}}
    document = plan_document(sessions, a=clock, b=YB)
    expected = (2 * 2e-18**2 + 2 * 1e-18**2) ** 0.5
    assert u_of(document) == pytest.approx(expected, rel=1e-5)
    # Without the unknown ratio, the remote session alone is better than the detour over home ...
    alone = plan_document(sessions[1:], a={**clock, "effect": effects[1:]})
    assert u_of(alone) == pytest.approx((2e-18**2 + 1e-18**2) ** 0.5, rel=1e-5)
    # ... and carries the constant effect in full.
    whole = plan_document(sessions[1:], a=clock)
    expected = (9e-18**2 + 2e-18**2 + 1e-18**2) ** 0.5
    assert u_of(whole) == pytest.approx(expected, rel=1e-5)


def test_two_calibrations_share_the_reproducibility():
    # u² = u_stay² (1 + 1/n) for n calibrations at home in stays of their own.
    clock = {"effect": [effect("stay", 2e-18, "stay")], "instability": {"white_fm": 1e-19}}
    sessions = [
        session("l1", "home", 0, 1),
        session("r", "away", 3, 1),
        session("l2", "home", 6, 1),
    ]
    assert u_of(plan_document(sessions, a=clock, b=YB)) == pytest.approx(2e-18 * 1.5**0.5, rel=1e-4)


def test_a_shared_effect_cancels():
    shared = {"effect": [effect("coefficient", 5e-18, shared="strontium")]}
    white = {"instability": {"white_fm": 1e-16}}
    one = [session("r", "away", 0, 1)]
    assert u_of(plan_document(one, a={**shared, **white}, b=shared)) == pytest.approx(
        1e-16 / 86_400.0**0.5, rel=1e-4
    )


def test_the_terms_add_up_and_have_their_names(project):
    document = read_document(project / "examples" / "lantern-islands" / "campaign.toml")
    from clockgeo.planning import plan

    planned = plan(document)
    for goal in goals_of(planned.prediction.model):
        terms = planned.prediction.terms(goal)
        assert {STATISTICS, DEAD_TIME, FLICKER, STAYS, "effects of links"} <= set(terms)
        assert {"site transfer", "tide residual", "geodetic data"} <= set(terms)
        total = sum(part**2 for part in terms.values()) ** 0.5
        assert total == pytest.approx(planned.prediction.u(goal), rel=1e-9)
    assert EFFECTS in planned.prediction.terms(goals_of(planned.prediction.model)[0])


def test_known_datums_by_hand():
    # Two datums with one point each: u² of their offset is u² of both heights and of the clocks.
    datum = {"kind": "normal", "tide_system": "zero_tide"}
    heights = [("north", "away", 0.006), ("south", "home", 0.008)]
    tables = [
        {"id": name, **datum, "height": [{"point": point, "height": 1.0, "u": u}]}
        for name, point, u in heights
    ]
    one = [session("r", "away", 0, 1)]
    document = plan_document(
        one,
        a={"instability": {"white_fm": 5e-16}},
        datum=tables,
        target={"offset": [{"from": "south", "to": "north", "u": 0.02}]},
    )
    prediction, goal = predicted(document)
    clocks = 5e-16 / 86_400.0**0.5 * C_SQUARED / goal.gravity
    expected = (0.006**2 + 0.008**2 + clocks**2) ** 0.5
    # Gravity differs by 1e-4 between the sites, and with it what 1 m is in potential.
    assert_close(prediction.u(goal), expected, tolerance=2e-4 * expected)


def test_the_plan_says_what_level_says(project):
    # The same model: where the records are as stated, level finds the predicted u again, but for
    # its own fit of the noise (a few per cent of the statistics with 7 records), in which a floor
    # that does not show may still be there.
    document = read_document(project / "examples" / "saddle" / "campaign.toml")
    # Excess scatter is what a plan cannot foresee; the example's own draw may show some.
    head = document.campaign.head.model_copy(update={"scatter": "none"})
    document = replace(document, campaign=document.campaign.model_copy(update={"head": head}))
    prediction, goal = predicted(document)
    found = level(document).result.differences[0]
    potential = prediction.u(goal) * goal.gravity
    assert found.u == pytest.approx(potential, rel=0.2)


def test_a_clock_that_two_sessions_share_at_the_same_time_counts_once():
    # Two places against one clock at the same time: its white noise cancels in their difference,
    # however long the sessions; one after the other, it does not.
    def document(second_start):
        other = {**session("c", "far", second_start, 1), "numerator": {"clock": "c", "site": "far"}}
        quiet, loud = ({"instability": {"white_fm": level}} for level in (1e-16, 8e-16))
        return plan_document(
            [session("a", "away", 0, 1), other],
            clock=[
                {"id": "a", "transition": "87Sr", **quiet},
                {"id": "b", "transition": "87Sr", **loud},
                {"id": "c", "transition": "87Sr", **quiet},
            ],
            site=[
                {"id": "home", "latitude": 50.0, "longitude": 8.0, "geopotential_number": 0.0},
                {"id": "away", "latitude": 51.0, "longitude": 9.0},
                {"id": "far", "latitude": 49.0, "longitude": 9.0},
            ],
            target={"difference": [{"from": "away", "to": "far", "u_height": 0.1}]},
        )

    day = 86_400.0
    assert u_of(document(0)) == pytest.approx((2 * 1e-32 / day) ** 0.5, rel=1e-6)
    assert u_of(document(1)) == pytest.approx((2 * 65e-32 / day) ** 0.5, rel=1e-6)
    # Half of the time in common: half of the shared part is left.
    assert u_of(document(0.5)) == pytest.approx((2 * 1e-32 / day + 64e-32 / day) ** 0.5, rel=1e-6)


def test_session_statistics_follow_the_windows():
    sessions = [session("short", "away", 0, 0.5), session("long", "away", 1, 2)]
    document = plan_document(sessions, a={"instability": {"white_fm": 3e-16}})
    prediction, _ = predicted(document)
    expected = 3e-16 / np.sqrt([43_200.0, 172_800.0])
    np.testing.assert_allclose(prediction.session_statistics(), expected, rtol=1e-6)
