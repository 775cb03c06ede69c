"""Rows of sessions: signs, transfers, stays, and what cancels in local, remote, local."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close
from clockgeo.constants import SPEED_OF_LIGHT_SQUARED
from clockgeo.gravity import TideSystem
from clockgeo.levelling.effects import Effect, EffectKey
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.session_rows import (
    NumberOf,
    RatioError,
    RatioPrior,
    SessionMean,
    add_known_number,
    add_session_rows,
    ratio_of,
    same_expectation,
    stays_of,
    systematic_loads,
    transfer_difference,
)
from clockgeo.levelling.solution import solve
from clockgeo.levelling.stations import Clock, Link, Site

MEAN = TideSystem.MEAN_TIDE
C2 = SPEED_OF_LIGHT_SQUARED.value
VALLEY = Site(id="valley", latitude=47.0, longitude=11.0, gravity=9.806)
SUMMIT = Site(id="summit", latitude=46.9, longitude=11.5, gravity=9.802)


def clock(name, *effects, species="1000"):
    return Clock(id=name, nominal_frequency=species, effect=effects)


def mean(name, n, n_site, d, d_site, *, start, y=0.0, links=(), u_tide=0.0):
    return SessionMean(name, n, n_site, d, d_site, links, start, y, u_tide)


def solved(means, u=1e-18, ratios=None):
    builder = ModelBuilder()
    add_known_number(builder, "valley", 5000.0, 0.0)
    covariance = np.eye(len(means)) * u**2
    add_session_rows(builder, means, covariance, tide_system=MEAN, ratios=ratios)
    return solve(builder.build())


def test_a_positive_y_puts_the_numerator_higher():
    one = mean("s", clock("a"), SUMMIT, clock("b"), VALLEY, start=0, y=1e-13)
    solution = solved([one])
    assert_close(solution.value({NumberOf("summit"): 1}), 5000 + 1e-13 * C2, tolerance=1e-9)
    turned = mean("s", clock("b"), VALLEY, clock("a"), SUMMIT, start=0, y=-1e-13)
    assert_close(solved([turned]).value({NumberOf("summit"): 1}), 5000 + 1e-13 * C2, tolerance=1e-9)


def test_the_transfer_is_taken_off_the_atoms():
    """Identity: atoms 2 m above a marker raise y by g * 2 m and leave the marker's number alone."""
    raised = SUMMIT.model_copy(update={"atoms_above_marker": 2.0, "gravity_gradient": 0.0})
    one = mean("s", clock("a"), raised, clock("b"), VALLEY, start=0, y=9.802 * 2.0 / C2)
    assert_close(transfer_difference(one, MEAN), 9.802 * 2.0, tolerance=1e-9)
    assert_close(solved([one]).value({NumberOf("summit"): 1}), 5000.0, tolerance=1e-9)


# Permanent tide on GRS80, 0.9722 - 2.8841 sin2 - 0.0195 sin4 (Makinen and Ihde 2009, from memory):
# C_mean = C_zero - Wp, so markers in zero tide differ from what the clocks feel by Wp_A - Wp_B.
def test_markers_in_zero_tide_differ_by_the_permanent_tide():
    north = SUMMIT.model_copy(update={"latitude": 60.0})
    south = VALLEY.model_copy(update={"latitude": 30.0})
    one = mean("s", clock("a"), north, clock("b"), south, start=0)

    def permanent(latitude):
        sine = np.sin(np.radians(latitude)) ** 2
        return 0.9722 - 2.8841 * sine - 0.0195 * sine**2

    expected = permanent(30.0) - permanent(60.0)
    assert_close(transfer_difference(one, TideSystem.ZERO_TIDE), expected, tolerance=1e-4)


def test_a_clock_may_stand_differently_from_the_others():
    site = SUMMIT.model_copy(update={"atoms_above_marker": 2.0, "atoms_of": {"b": 0.5}})
    assert site.atoms_height("a") == 2.0
    assert site.atoms_height("b") == 0.5


def local_remote_local(effect):
    n, d = clock("a", effect, species="2000"), clock("b")
    return [
        mean("local 1", n, VALLEY, d, VALLEY, start=1),
        mean("remote", n, SUMMIT, d, VALLEY, start=2),
        mean("local 2", n, VALLEY, d, VALLEY, start=3),
    ]


def test_a_constant_effect_vanishes_from_local_remote_local():
    with_effect = solved(local_remote_local(Effect(name="shift", u=5e-17)))
    without = solved(local_remote_local(Effect(name="shift", u=0.0)))
    difference = {NumberOf("summit"): 1.0}
    # u = sqrt(1 + 1/2) of one session's noise, whatever the effect.
    assert_close(with_effect.u(difference), 1.5**0.5 * 1e-18 * C2, tolerance=1e-9)
    assert_close(without.u(difference), 1.5**0.5 * 1e-18 * C2, tolerance=1e-9)


def test_an_effect_renewed_at_each_stay_does_not_vanish():
    """By hand: u_s^2 of the remote stay plus half of it for the mean of two local stays."""
    renewed = local_remote_local(Effect(name="shift", u=5e-17, renewed="stay"))
    u = solved(renewed).u({NumberOf("summit"): 1.0})
    assert_close(u, (1.5 * (5e-17**2 + 1e-18**2)) ** 0.5 * C2, tolerance=1e-6)


def test_stays_are_counted_by_place():
    stays = stays_of(local_remote_local(Effect(name="shift", u=0.0)))
    assert stays["a", "local 1"] == "stay 1 at valley"
    assert stays["a", "remote"] == "stay 2 at summit"
    assert stays["a", "local 2"] == "stay 3 at valley"
    assert stays["b", "local 1"] == stays["b", "local 2"] == "stay 1 at valley"


def test_an_effect_shared_by_both_clocks_cancels():
    effect = Effect(name="coefficient", u=5e-17, shared="species")
    one = mean("s", clock("a", effect), SUMMIT, clock("b", effect), VALLEY, start=0)
    assert systematic_loads(one, stays_of([one])).get(EffectKey("species", "coefficient")) is None


def test_links_and_tide_are_loads_of_their_own():
    link = Link(id="fibre", effect=(Effect(name="ends", u=3e-19),))
    one = mean("s", clock("a"), SUMMIT, clock("b"), VALLEY, start=0, links=(link,), u_tide=2e-19)
    loads = systematic_loads(one, stays_of([one]))
    assert_close(loads[EffectKey("fibre", "ends")], 3e-19 * C2, tolerance=1e-12)
    assert_close(loads[EffectKey("solid Earth", "tide model", "s")], 2e-19 * C2, tolerance=1e-12)


def test_the_ratio_of_two_species_is_one_unknown_with_a_sign():
    light, heavy = clock("a", species="1000"), clock("b", species="2000")
    assert ratio_of(light, heavy) == (RatioError("1000", "2000"), 1.0)
    assert ratio_of(heavy, light) == (RatioError("1000", "2000"), -1.0)
    assert ratio_of(light, clock("c", species="1000")) is None


def test_a_prior_of_the_nominal_ratio_is_an_effect():
    n, d = clock("a", species="1000"), clock("b", species="2000")
    one = mean("remote", n, SUMMIT, d, VALLEY, start=1)
    solution = solved([one], ratios={RatioError("1000", "2000"): RatioPrior(3e-17)})
    expected = (3e-17**2 + 1e-18**2) ** 0.5 * C2
    assert_close(solution.u({NumberOf("summit"): 1}), expected, tolerance=1e-9)


def test_an_unknown_ratio_without_calibration_is_refused():
    from clockgeo.errors import DataError

    n, d = clock("a", species="1000"), clock("b", species="2000")
    with pytest.raises(
        DataError,
        match=r"do not determine all unknowns: .*ratio 1000/2000, geopotential number of summit",
    ):
        solved([mean("remote", n, SUMMIT, d, VALLEY, start=1)])


def test_sessions_alike_are_told_from_those_with_effects_of_their_own():
    constant, moving = (
        Effect(name="lattice", u=1e-18),
        Effect(name="set-up", u=1e-18, renewed="stay"),
    )
    far = clock("b")
    for effect, expected in ((constant, [0, 1, 0, 0]), (moving, [0, 1, 2, 2])):
        near = clock("a", effect)
        placed = [(VALLEY, 0), (SUMMIT, 1), (VALLEY, 2), (VALLEY, 3)]
        means = [
            mean(f"s{k}", near, site, far, VALLEY, start=k, u_tide=1e-19) for site, k in placed
        ]
        # The last one is run the other way round.
        means[3] = mean("s3", far, VALLEY, near, VALLEY, start=3)
        assert same_expectation(means) == expected
