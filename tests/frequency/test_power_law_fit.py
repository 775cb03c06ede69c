"""All power laws at once: the likelihood by another route, recovery, stated doubt, servos."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, TickSeries, draw_noise, fit_power_laws
from clockgeo.frequency.components import Piece, fit_components, minus_two_log
from clockgeo.frequency.law_covariances import LAWS, of_blocks, of_samples


def record(model, rng, *, count=20_000, run=400, uptime=0.8):
    """A record in runs of samples with gaps between."""
    y = draw_noise(model, count, 1.0, rng)
    tick = np.flatnonzero(np.repeat(rng.random(count // run) < uptime, run))
    return TickSeries(tick, y[tick])


@pytest.mark.parametrize("law", LAWS)
def test_covariances_of_samples_are_those_of_drawn_noise(law):
    """Second route: means of many draws. Flicker FM is drawn by a filter that is 11 % too strong
    from one sample to the next, and right over longer times."""
    rng = np.random.default_rng(17)
    model, size = NoiseModel(**{law: 1.0}), 48
    draws = [draw_noise(model, 20 * size, 2.0, rng)[9 * size : 10 * size] for _ in range(4000)]
    centred = np.eye(size) - 1.0 / size
    seen = centred @ np.cov(np.array(draws), rowvar=False) @ centred
    expected = centred @ of_samples(np.arange(size), 2.0)[law] @ centred
    halves = np.repeat([1.0, -1.0], size // 2) / (size // 2)
    assert halves @ seen @ halves == pytest.approx(halves @ expected @ halves, rel=0.1)
    if law != "flicker_fm":
        assert np.trace(seen) == pytest.approx(np.trace(expected), rel=0.05)


@pytest.mark.parametrize("law", LAWS)
def test_covariances_of_blocks_are_sums_of_those_of_samples(law):
    """Identity: unbroken blocks of five samples against the average of sample covariances."""
    tick = np.arange(60)
    averaging = np.kron(np.eye(12), np.full(5, 0.2))
    place = np.arange(12)
    ends = (5 * place, 5 * place + 5)
    five, one = np.full(12, 5.0), np.ones(12)
    blocks = of_blocks(place, five, ends, one, width=10.0, interval=2.0)[law]
    samples = averaging @ of_samples(tick, 2.0)[law] @ averaging.T
    centred = np.eye(12) - 1.0 / 12.0
    np.testing.assert_allclose(
        centred @ blocks @ centred,
        centred @ samples @ centred,
        rtol=1e-6,
        atol=1e-9 * samples.max(),
    )


def test_the_likelihood_is_that_of_a_normal_vector(rng):
    tick = np.flatnonzero(rng.random(60) < 0.8)
    y = draw_noise(NoiseModel(white_pm=2.0, white_fm=1.0), 60, 1.0, rng)[tick]
    contrasts = np.linalg.svd(np.ones((1, tick.size)))[2][1:].T
    covariances = of_samples(tick, 1.0)
    piece = Piece.of_contrasts(contrasts, y, covariances)
    levels = {"white_pm": 3.0, "flicker_pm": 0.5, "white_fm": 1.2, "flicker_fm": 0.2}
    whole = contrasts.T @ sum(level * covariances[law] for law, level in levels.items()) @ contrasts
    logpdf = stats.multivariate_normal.logpdf(contrasts.T @ y, cov=whole)
    expected = -2.0 * logpdf - (tick.size - 1) * np.log(2.0 * np.pi)
    assert minus_two_log(piece, levels) == pytest.approx(expected, rel=1e-9)
    # No level nearby is likelier than the fitted ones, and the fit says so itself.
    found = fit_components([piece], LAWS)
    assert found.minus_two_log == pytest.approx(minus_two_log(piece, found.levels), abs=1e-6)
    for law in LAWS:
        for factor in (0.8, 1.25):
            other = {**found.levels, law: factor * found.levels[law] + 1e-6}
            assert minus_two_log(piece, other) > found.minus_two_log - 1e-4


def test_the_information_is_the_curvature(rng):
    """Second route: second differences of the expected likelihood, by drawing at the estimate."""
    tick = np.arange(80)
    covariances = of_samples(tick, 1.0)
    contrasts = np.linalg.svd(np.ones((1, 80)))[2][1:].T
    true = {"white_pm": 4.0, "white_fm": 1.0}
    whole = contrasts.T @ sum(v * covariances[k] for k, v in true.items()) @ contrasts
    root = np.linalg.cholesky(whole)
    parts = {law: contrasts.T @ covariances[law] @ contrasts for law in true}
    fits = [
        fit_components([Piece(root @ rng.standard_normal(79), parts)], list(true))
        for _ in range(400)
    ]
    both = [fit for fit in fits if len(fit.names) == 2]
    assert len(both) > 390
    levels = np.array([[fit.levels[law] for law in true] for fit in both])
    stated = np.mean([fit.covariance for fit in both], axis=0)
    np.testing.assert_allclose(np.cov(levels, rowvar=False), stated, rtol=0.25)


@pytest.mark.parametrize(
    "model",
    [
        NoiseModel(white_fm=1e-15),
        NoiseModel(white_pm=2e-14, white_fm=1e-15),
        NoiseModel(flicker_pm=2e-14, white_fm=4e-15),
        NoiseModel(white_pm=1e-14, random_walk_fm=2e-17),
        NoiseModel(white_fm=1e-15, flicker_fm=2e-16),
    ],
)
def test_laws_and_levels_are_recovered_within_their_u(model):
    rng = np.random.default_rng(31)
    laws = {law for law, level in model.model_dump().items() if level}
    deviations, right = [], 0
    for _ in range(16):
        fit = fit_power_laws([record(model, rng)], interval=1.0)
        assert fit.short_times
        right += set(fit.laws) == laws
        if set(fit.laws) == laws:
            deviations += [
                (getattr(fit.model, law) - getattr(model, law)) / fit.u[law] for law in laws
            ]
            assert fit.covariance.shape == (len(laws), len(laws))
            assert np.all(np.linalg.eigvalsh(fit.covariance) > 0.0)
    assert right >= 12
    assert 0.5 < np.sqrt(np.mean(np.square(deviations))) < 1.6


def test_a_servo_leaves_the_long_averages_to_themselves():
    """Samples that a servo has smoothed follow no power law and must not shape the white level."""
    rng = np.random.default_rng(5)
    smooth = np.convolve(rng.standard_normal(60_000), np.ones(15) / 15.0, mode="valid")
    fit = fit_power_laws([TickSeries(np.arange(smooth.size), smooth)], interval=1.0)
    assert not fit.short_times
    assert fit.from_seconds > 100.0
    assert fit.model.white_fm == pytest.approx(1.0, rel=0.2)
    assert (fit.model.white_pm, fit.model.flicker_pm) == (0.0, 0.0)


def test_scale_does_as_it_must(rng):
    one = record(NoiseModel(white_pm=1e-14, white_fm=1e-15), rng)
    plain = fit_power_laws([one], interval=1.0)
    scaled = fit_power_laws([TickSeries(one.tick + 9, 7.0 * one.y + 3e-12)], interval=1.0)
    assert scaled.laws == plain.laws
    for law in plain.laws:
        assert getattr(scaled.model, law) == pytest.approx(7 * getattr(plain.model, law), rel=1e-3)


def test_too_few_samples_are_refused():
    with pytest.raises(DataError, match=r"too few valid samples to fit power laws.*4 blocks"):
        fit_power_laws([TickSeries(np.arange(4), np.arange(4.0))], interval=1.0)


def test_rows_of_a_lambda_counter_do_not_count_one_by_one():
    """Triangular weights over two gates keep the mean; a third of the white variance is gone."""
    rng = np.random.default_rng(12)
    fine = rng.standard_normal((20_001, 40))
    rising, falling = (np.arange(40) + 0.5) / 40.0, (39.5 - np.arange(40)) / 40.0
    rows = fine[:-1] @ rising / 40.0 + fine[1:] @ falling / 40.0
    series = [TickSeries(np.arange(rows.size), rows)]
    true = 1.0 / np.sqrt(40.0)
    assert np.std(rows) == pytest.approx(true * np.sqrt(2.0 / 3.0), rel=0.05)
    fit = fit_power_laws(series, interval=1.0, single_samples=False)
    assert not fit.short_times
    assert fit.model.white_fm == pytest.approx(true, abs=3.0 * fit.u["white_fm"])
    assert fit.model.white_pm == fit.model.flicker_pm == 0.0
