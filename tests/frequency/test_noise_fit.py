"""The fit of noise: recovery of truth, the likelihood by another route, doubt, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, TickSeries, draw_noise, fit_noise
from clockgeo.frequency.mean import block_kernel


def sessions(model, rng, *, count=900, uptime=0.6):
    """Three gapped sessions of one process."""
    y = draw_noise(model, 3 * count + 600, 10.0, rng)
    parts = []
    for first in (0, count + 300, 2 * count + 600):
        places = np.arange(first, first + count)
        places = places[rng.random(count) < uptime]
        parts.append(TickSeries(places, y[places]))
    return parts


@pytest.mark.parametrize(
    ("model", "laws"),
    [
        (NoiseModel(white_fm=1e-15), {"white_fm"}),
        (NoiseModel(white_fm=1e-16, flicker_fm=4e-17), {"white_fm", "flicker_fm"}),
        (NoiseModel(white_fm=1e-15, random_walk_fm=1e-18), {"white_fm", "random_walk_fm"}),
    ],
)
def test_levels_and_laws_are_recovered(model, laws):
    rng = np.random.default_rng(11)
    fits = [fit_noise(sessions(model, rng), interval=10.0) for _ in range(12)]
    chosen = [{law for law, level in fit.model.model_dump().items() if level} for fit in fits]
    assert chosen.count(laws) >= 9
    for law in laws:
        levels = [getattr(fit.averaged, law) for fit in fits]
        # A level is known to some 10 to 20 % from one campaign; the median of twelve to 6 %.
        assert np.median(levels) == pytest.approx(getattr(model, law), rel=0.2), law


def test_the_likelihood_is_that_of_contrasts(rng):
    """Independent second route: the density of orthonormal contrasts as a normal vector."""
    y = draw_noise(NoiseModel(white_fm=1.0, flicker_fm=0.5), 60, 1.0, rng)
    fit = fit_noise([TickSeries(np.arange(60), y)], interval=1.0)
    contrasts = np.linalg.svd(np.ones((1, 60)))[2][1:]

    def loss(white, slow):
        kernel = block_kernel(NoiseModel(flicker_fm=1.0), np.arange(60), 1.0, 60.0)
        covariance = contrasts @ (white * np.eye(60) + slow * kernel) @ contrasts.T
        logpdf = stats.multivariate_normal.logpdf(contrasts @ y, cov=covariance)
        return float(-2.0 * logpdf - 59 * np.log(2.0 * np.pi))

    grid = [loss(w, s) for w in np.linspace(0.4, 2.0, 41) for s in np.linspace(0.0, 2.0, 41)]
    penalty = 2.0 * np.log(59)
    assert fit.information["flicker_fm"] == pytest.approx(min(grid) + penalty, abs=0.05)


def test_what_does_not_show_may_still_be_there():
    """A floor that white noise hides stays possible: averaged in, and its limit stated."""
    rng = np.random.default_rng(3)
    fit = fit_noise(sessions(NoiseModel(white_fm=1e-15), rng), interval=10.0)
    assert fit.model.flicker_fm == 0.0
    assert 0.0 < fit.averaged.flicker_fm < fit.flicker_limit
    assert fit.degrees_of_freedom > 4.0


def test_a_drift_is_found_with_its_u_and_no_walk_is_made_of_it():
    rng = np.random.default_rng(21)
    model = NoiseModel(white_fm=1e-15)
    seen = []
    for _ in range(30):
        fit = fit_noise(
            [
                TickSeries(one.tick, one.y + 4e-20 * 10.0 * one.tick)
                for one in sessions(model, rng, uptime=0.9)
            ],
            interval=10.0,
        )
        if fit.u_drift is not None:
            seen.append(((fit.model.drift - 4e-20) / fit.u_drift, fit.model.random_walk_fm))
    assert len(seen) > 20
    deviations, walks = np.array(seen).T
    # Of Student's kind: wider than one; thirty draws know their spread to 13 %.
    assert 0.5 < np.std(deviations) < 1.6
    assert np.count_nonzero(walks) <= 3


def test_no_drift_is_made_of_noise():
    rng = np.random.default_rng(22)
    model = NoiseModel(white_fm=1e-16, flicker_fm=3e-17)
    fits = [fit_noise(sessions(model, rng), interval=10.0) for _ in range(20)]
    assert sum(fit.model.drift != 0.0 for fit in fits) <= 2


def test_servo_correlation_falls_into_blocks():
    """Neighbouring samples that a servo has made alike do not make the white level too small."""
    rng = np.random.default_rng(8)
    white = rng.standard_normal(40_000)
    smooth = np.convolve(white, np.ones(10) / 10.0, mode="valid")
    fit = fit_noise([TickSeries(np.arange(smooth.size), smooth)], interval=1.0)
    assert fit.model.white_fm == pytest.approx(1.0, rel=0.12)
    assert np.std(smooth) < 0.35


def test_scale_and_shift_do_as_they_must(rng):
    parts = sessions(NoiseModel(white_fm=1e-15, flicker_fm=1e-16), rng)
    plain = fit_noise(parts, interval=10.0)
    moved = [TickSeries(one.tick + 77, 3.0 * one.y + 5e-13 * k) for k, one in enumerate(parts)]
    other = fit_noise(moved, interval=10.0)
    assert other.model.white_fm == pytest.approx(3.0 * plain.model.white_fm, rel=1e-3)
    assert other.averaged.flicker_fm == pytest.approx(3.0 * plain.averaged.flicker_fm, rel=1e-3)
    assert other.degrees_of_freedom == pytest.approx(plain.degrees_of_freedom, rel=1e-3)


def test_too_few_samples_are_refused():
    with pytest.raises(DataError, match=r"too few valid samples to fit.*4 blocks in 1 sessions"):
        fit_noise([TickSeries(np.arange(4), np.arange(4.0))], interval=1.0)
