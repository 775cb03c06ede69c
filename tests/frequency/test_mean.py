"""Means of gapped sessions under power-law noise: published contrasts and independent routes."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_published
from clockgeo.frequency import NoiseModel, TickSeries, draw_noise, mean_covariance
from clockgeo.frequency.mean import block_kernel

DAY = 86_400


def session(first_day, days, interval=60.0):
    places = np.arange(int(first_day * DAY / interval), int((first_day + days) * DAY / interval))
    return TickSeries(places, np.zeros(places.size))


def u_of(model, parts, weights, interval=60.0):
    covariance = mean_covariance(model, parts, interval=interval)
    return float(np.sqrt(np.array(weights) @ covariance @ np.array(weights)))


@pytest.mark.parametrize(
    ("weights", "printed"), [((-0.5, 1.0, -0.5), "1.2930e-17"), ((-1.0, 1.0, 0.0), "1.6063e-17")]
)
def test_five_days_each_with_a_floor(weights, printed):
    """Local 5 d, gap 2 d, remote 5 d, gap 2 d, local 5 d; flicker floor 1e-17 (spectral route)."""
    parts = [session(0, 5), session(7, 5), session(14, 5)]
    assert_published(u_of(NoiseModel(flicker_fm=1e-17), parts, weights), printed)


def test_fifteen_short_days():
    """Fifteen daily sessions of 0.6 d, 5 + 5 + 5 with gaps of 2 d; 1e-15/sqrt(tau), floor 5e-18."""
    starts = [*range(5), *range(7, 12), *range(14, 19)]
    parts = [session(day, 0.6) for day in starts]
    model = NoiseModel(white_fm=1e-15, flicker_fm=5e-18)
    covariance = mean_covariance(model, parts, interval=60.0)
    design = np.ones((15, 2))
    design[:5, 1] = design[10:, 1] = 0.0
    weight = np.linalg.inv(covariance)
    cofactor = np.linalg.inv(design.T @ weight @ design)
    assert_published(float(np.sqrt(cofactor[1, 1])), "6.880e-18")


def test_two_neighbouring_means_give_the_allan_variance():
    """Identity: half the variance of the difference of neighbouring means is AVAR."""
    for model, tau in (
        (NoiseModel(white_fm=2e-15), 3600.0),
        (NoiseModel(flicker_fm=3e-17), 3600.0),
        (NoiseModel(random_walk_fm=1e-19), 3600.0),
    ):
        parts = [TickSeries(np.arange(k * 360, (k + 1) * 360), np.zeros(360)) for k in (0, 1)]
        u = u_of(model, parts, (-1.0, 1.0), interval=10.0)
        assert u**2 / 2.0 == pytest.approx(float(model.allan_variance(tau)), rel=1e-9)


def test_blocks_change_little():
    """A long record is averaged in blocks; tick by tick gives the same to a few per mille."""
    rng = np.random.default_rng(5)
    places = [np.arange(0, 2000), np.arange(2500, 4500)]
    parts = [TickSeries(p[rng.random(p.size) < 0.4], np.zeros(0)) for p in places]
    parts = [TickSeries(one.tick, np.zeros(one.tick.size)) for one in parts]
    model = NoiseModel(flicker_fm=1.0)
    blocks = u_of(model, parts, (-1.0, 1.0), interval=1.0)
    every = np.concatenate([one.tick for one in parts])
    kernel = block_kernel(model, every, 1.0, 4500.0)
    weights = np.concatenate(
        [s * np.ones(p.tick.size) / p.tick.size for s, p in zip((-1, 1), parts, strict=True)]
    )
    assert blocks == pytest.approx(float(np.sqrt(weights @ kernel @ weights)), rel=5e-3)


@pytest.mark.parametrize(
    "model",
    [NoiseModel(white_fm=1e-15), NoiseModel(flicker_fm=3e-17), NoiseModel(random_walk_fm=3e-19)],
)
def test_drawn_contrasts_scatter_as_stated(model):
    rng = np.random.default_rng(9)
    places = [np.arange(600, 900), np.arange(1000, 1300)]
    parts = [TickSeries(p[::2], np.zeros(150)) for p in places]
    u = u_of(model, parts, (-1.0, 1.0), interval=10.0)
    drawn = []
    for _ in range(400):
        y = draw_noise(model, 1900, 10.0, rng)
        drawn.append(y[parts[1].tick].mean() - y[parts[0].tick].mean())
    # The spread of 400 draws is known to 3.5 %; three times that.
    assert np.std(drawn) == pytest.approx(u, rel=0.11)


def test_the_kernel_far_away_joins_the_kernel_nearby():
    near = block_kernel(NoiseModel(flicker_fm=1.0), np.array([0, 100]), 1.0, 1e4)[0, 1]
    far = block_kernel(NoiseModel(flicker_fm=1.0), np.array([0, 101]), 1.0, 1e4)[0, 1]
    h = NoiseModel(flicker_fm=1.0).h_minus1
    assert near - far == pytest.approx(h * np.log(101 / 100), rel=1e-4)
