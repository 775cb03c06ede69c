"""Correlations and closures of clock sessions: by hand, by rank, by overlap."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from checks import assert_published
from clockgeo.frequency import NoiseModel, TickSeries, mean_covariance
from clockgeo.gravity import TideSystem
from clockgeo.levelling.closures import closures_of
from clockgeo.levelling.correlations import correlations_of, single_rows
from clockgeo.levelling.effects import Effect
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.redshift import potential_from_shift
from clockgeo.levelling.session_rows import SessionMean, add_session_rows
from clockgeo.levelling.stations import Clock, Site

SITE = Site(id="home", latitude=50.0, longitude=10.0, gravity=9.81)
U = {"A": 5e-18, "B": 3e-18, "C": 2e-18}
COMMON = 1.5e-18


def clock(name, transition="87Sr"):
    own = np.sqrt(U[name] ** 2 - COMMON**2)
    effects = (
        Effect(name="coefficient", u=COMMON, shared="species"),
        Effect(name="own", u=own),
    )
    return Clock(id=name, transition=transition, effect=effects)


def means_of(pairs, values):
    return [
        SessionMean(
            id=f"{n}/{d}",
            numerator=clock(n),
            numerator_site=SITE,
            denominator=clock(d),
            denominator_site=SITE,
            links=(),
            start_ns=k * 10**12,
            y=y,
        )
        for k, ((n, d), y) in enumerate(zip(pairs, values, strict=True))
    ]


def model_of(pairs, values, *, statistics=0.0, noise=None):
    means = means_of(pairs, values)
    builder = ModelBuilder()
    covariance = np.eye(len(means)) * statistics**2 if noise is None else noise
    add_session_rows(builder, means, covariance, tide_system=TideSystem.ZERO_TIDE)
    return means, builder.build()


@pytest.mark.parametrize(
    ("first", "second", "printed"),
    [("A/B", "A/C", "0.846228"), ("A/B", "B/C", "-0.426269"), ("A/C", "B/C", "0.121268")],
)
def test_three_clocks_of_one_species(first, second, printed):
    """u of 5, 3 and 2 (1e-18), of which 1.5 is common to the species: recomputed by hand."""
    _, model = model_of([("A", "B"), ("A", "C"), ("B", "C")], [0.0, 0.0, 0.0])
    found = {(c.first, c.second): c for c in correlations_of(model, single_rows(model, model.rows))}
    correlation = found[first, second]
    assert_published(correlation.coefficient, printed)
    assert sum(correlation.parts.values()) == pytest.approx(correlation.coefficient, abs=1e-12)
    # What the species has in common cancels in each ratio and causes nothing.
    assert not any("coefficient" in cause for cause in correlation.parts)


def test_overlapping_white_noise():
    """10 d and 8 d with 6 d in common, white FM: r = 6/sqrt(80)."""
    series = [TickSeries(t, np.zeros(t.size)) for t in (np.arange(240), np.arange(96, 288))]
    covariance = mean_covariance(NoiseModel(white_fm=1e-15), series, interval=3600.0)
    u = [1e-15 / np.sqrt(3600.0 * one.tick.size) for one in series]
    assert np.diag(covariance) == pytest.approx(np.square(u), rel=1e-12)
    assert_published(covariance[0, 1] / (u[0] * u[1]), "0.670820")


def test_overlapping_slow_noise_follows_the_kernel():
    """Means over [0, 3] and [2, 6]: -h-1 ∫∫ ln|t - s| over both, by quadrature; contrasts only."""
    model = NoiseModel(flicker_fm=1.0)
    spans = ((0.0, 3.0), (2.0, 6.0), (7.0, 8.0))
    series = [
        TickSeries(np.arange(round(100 * a), round(100 * b)), np.zeros(round(100 * (b - a))))
        for a, b in spans
    ]
    covariance = mean_covariance(model, series, interval=0.01)

    def kernel(one, other):
        (a, b), (c, d) = one, other

        def inner(t):
            # ∫ -ln|t - s| ds in closed form; the outer integral by quadrature.
            ends = [(t - c) * np.log(abs(t - c)) if t != c else 0.0]
            ends.append((d - t) * np.log(abs(d - t)) if t != d else 0.0)
            return (d - c) - sum(ends)

        inside = [end for end in (c, d) if a < end < b]
        value, _ = quad(inner, a, b, points=inside or None, limit=200)
        return model.h_minus1 * value / ((b - a) * (d - c))

    expected = np.array([[kernel(one, other) for other in spans] for one in spans])
    for weights in ([1.0, -1.0, 0.0], [1.0, 0.0, -1.0], [0.5, 0.5, -1.0]):
        contrast = np.array(weights)
        assert contrast @ covariance @ contrast == pytest.approx(
            contrast @ expected @ contrast, rel=2e-5
        )


def test_a_third_ratio_of_the_same_data_is_an_identity():
    means, model = model_of([("A", "B"), ("A", "C"), ("B", "C")], [7e-18, 4e-18, -3e-18])
    (closure,) = closures_of(means, model)
    assert closure.identity
    assert closure.normalised is None
    assert closure.misclosure == pytest.approx(0.0, abs=1e-12)


def test_a_third_ratio_measured_on_its_own_is_a_check():
    means, model = model_of(
        [("A", "B"), ("A", "C"), ("B", "C")], [7e-18, 4e-18, -1e-18], statistics=1e-18
    )
    (closure,) = closures_of(means, model)
    assert not closure.identity
    # Effects cancel around the loop: only three statistical parts are left.
    assert closure.u == pytest.approx(potential_from_shift(np.sqrt(3.0) * 1e-18), rel=1e-9)
    assert abs(closure.misclosure) == pytest.approx(potential_from_shift(2e-18), rel=1e-9)


def test_repeated_sessions_close_with_each_other():
    means, model = model_of([("A", "B"), ("B", "A")], [7e-18, -6e-18], statistics=1e-18)
    # Ids differ, ends are the same: the second session, run back, must give the first.
    (closure,) = closures_of(means, model)
    assert closure.sessions == ("B/A", "A/B")
    assert closure.misclosure == pytest.approx(potential_from_shift(1e-18), rel=1e-9)


def test_loops_made_of_the_same_data_are_told_by_rank():
    """Two ways round the same ratio: each has a variance, together they have one."""
    pairs = [("A", "B"), ("B", "C"), ("A", "C"), ("C", "A")]
    # The last session is the third one, turned: the same noise with the other sign.
    noise = np.eye(4) * 1e-36
    noise[2, 3] = noise[3, 2] = -1e-36
    means, model = model_of(pairs, [7e-18, -3e-18, 5e-18, -5e-18], noise=noise)
    assert [one.identity for one in closures_of(means, model)] == [False, True]
    # Seen the other way round, a loop that repeats another's sum is one as well.
    turned = [means[k] for k in (0, 1, 3, 2)]
    assert [one.identity for one in closures_of(turned, model)] == [False, True]


def test_a_tree_of_sessions_has_no_loop():
    means, model = model_of([("A", "B"), ("B", "C")], [0.0, 0.0])
    del means[1]
    assert closures_of(means, model) == []
