"""Other techniques, and what changes of a plan bring."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close
from clockgeo.campaign.plan_schema import OtherTechniques
from clockgeo.levelling.stations import Site
from clockgeo.planning import goals_of, plan_model
from clockgeo.planning.alternatives import (
    break_even_distance,
    distance_between,
    u_of_gnss_geoid,
    u_of_levelling,
)
from clockgeo.planning.sensitivity import changes, visited_again, with_more_time
from invented_plan import plan_document, session


# L* = (u/s)² (digest of methods, 3.1).
@pytest.mark.parametrize(
    ("u", "per_root_km", "kilometres"),
    [(0.010, 1e-3, 100), (0.010, 0.5e-3, 400), (0.020, 1e-3, 400)],
)
def test_break_even(u, per_root_km, kilometres):
    techniques = OtherTechniques(levelling_per_root_km=per_root_km)
    assert_close(break_even_distance(techniques, u) / 1e3, kilometres, tolerance=1e-9)


def test_break_even_with_a_systematic_part():
    techniques = OtherTechniques(levelling_per_root_km=1e-3, levelling_per_km=0.05e-3)
    distance = break_even_distance(techniques, 0.02)
    assert distance < 400e3
    assert u_of_levelling(techniques, distance) == pytest.approx(0.02, rel=1e-12)
    only = OtherTechniques(levelling_per_root_km=0.0, levelling_per_km=0.1e-3)
    assert break_even_distance(only, 0.02) == pytest.approx(200e3)
    never = OtherTechniques(levelling_per_root_km=0.0, levelling_per_km=0.0)
    assert break_even_distance(never, 0.02) is None


def test_gnss_and_geoid():
    far = OtherTechniques(u_gnss=0.01, u_geoid=0.02)
    np.testing.assert_allclose(u_of_gnss_geoid(far, [1e3, 1e6]), 2**0.5 * 0.0005**0.5)
    alike = OtherTechniques(u_gnss=0.01, u_geoid=0.02, geoid_correlation_length=50e3)
    near, mid, away = u_of_gnss_geoid(alike, [1.0, 50e3, 1e7])
    assert near == pytest.approx(2**0.5 * 0.01, rel=1e-3)  # the geoid's errors cancel
    assert mid == pytest.approx((2 * (1e-4 + 4e-4 * (1 - np.exp(-1.0)))) ** 0.5)
    assert away == pytest.approx((2 * 5e-4) ** 0.5)


def test_distance_of_a_degree():
    # A degree along the equator: a π/180 with the semi-major axis 6 378 137 m of GRS80.
    first, second = (
        Site(id=name, latitude=0.0, longitude=x) for name, x in (("a", 0.0), ("b", 1.0))
    )
    assert distance_between(first, second) == pytest.approx(6_378_137.0 * np.pi / 180.0, rel=1e-12)


CLOCK = {
    "instability": {"white_fm": 6e-16},
    "effect": [
        {"name": "stay", "u": 2e-18, "renewed": "stay"},
        {"name": "session", "u": 1.5e-18, "renewed": "session"},
        {"name": "constant", "u": 3e-18},
    ],
}
LOCAL, REMOTE = session("l", "home", 0, 1), session("r", "away", 3, 1)


def model_of(*sessions, a=CLOCK):
    document = plan_document(sessions, a=a, b={"transition": "171Yb"})
    return plan_model(document, document.campaign.sessions)


def u_of(model):
    return model.solve().u(goals_of(model)[0])


def test_more_time_is_more_time():
    longer = session("r", "away", 3, 2)
    found = u_of(with_more_time(model_of(LOCAL, REMOTE), 1, 86_400.0))
    assert found == pytest.approx(u_of(model_of(LOCAL, longer)), rel=1e-9)


def test_another_visit_is_another_visit():
    # Calibrated, visited, calibrated again: the same as stating the third session.
    again = session("l2", "home", 6, 1)
    found = u_of(visited_again(model_of(LOCAL, REMOTE), 0))
    assert found == pytest.approx(u_of(model_of(LOCAL, REMOTE, again)), rel=1e-9)


def test_a_halved_effect_is_a_halved_effect():
    model = model_of(LOCAL, REMOTE)
    tried = {one.text: one.u[0] for one in changes(model.solve(), goals_of(model))}
    halved = [
        {**one, "u": one["u"] / 2} if one["name"] == "stay" else one for one in CLOCK["effect"]
    ]
    expected = u_of(model_of(LOCAL, REMOTE, a={**CLOCK, "effect": halved}))
    assert tried["halve u of a · stay"] == pytest.approx(expected, rel=1e-9)
    assert tried["a day more in r"] < u_of(model)
    assert tried["r once more, as a new stay"] < tried["a day more in r"]
    assert not any("constant" in text for text in tried)  # it cancels, so halving it is no use
