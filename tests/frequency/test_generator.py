"""Drawn noise: its Allan variance against the model's, and what it refuses."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, draw_noise

LAWS = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm")


def allan_variance(y, factor):
    """Overlapping, from the definition (IEEE Std 1139), by cumulated sums."""
    phase = np.concatenate(([0.0], np.cumsum(y)))
    second = phase[2 * factor :] - 2.0 * phase[factor:-factor] + phase[: -2 * factor]
    return np.mean(second**2) / (2.0 * factor**2)


def flicker_phase(factor):
    """Allan variance of flicker PM at a multiple of the interval, that at the interval being 1.

    E (x(t + n) - x(t))² goes as Σ 1/(2j - 1), j = 1 to n: ∫ 4 sin²(π f n)/(2 sin π f) df.
    """
    change = np.cumsum(1.0 / (2.0 * np.arange(1, 2 * factor + 1) - 1.0))
    return (4.0 * change[factor - 1] - change[2 * factor - 1]) / (8.0 / 3.0) / factor**2


@pytest.mark.parametrize("law", LAWS)
@pytest.mark.parametrize("interval", [1.0, 5.0])
def test_drawn_noise_has_the_stated_allan_variance(law, interval):
    rng = np.random.default_rng(6)
    model = NoiseModel(**{law: 3e-15})
    for factor in (4, 32):
        seen = np.mean(
            [allan_variance(draw_noise(model, 4000, interval, rng), factor) for _ in range(60)]
        )
        expected = float(model.allan_variance(factor * interval))
        if law == "flicker_pm":
            expected = float(model.allan_variance(interval)) * flicker_phase(factor)
        assert seen == pytest.approx(expected, rel=0.08)


def test_a_drift_is_drawn_about_the_middle():
    y = draw_noise(NoiseModel(drift=1e-18), 11, 10.0, np.random.default_rng(1))
    np.testing.assert_allclose(np.diff(y), 1e-17, rtol=1e-12)
    assert y[5] == 0.0


def test_equal_seeds_draw_equal_noise():
    model = NoiseModel(white_pm=1e-14, white_fm=1e-15, flicker_fm=1e-16)
    first, second = (draw_noise(model, 50, 1.0, np.random.default_rng(3)) for _ in range(2))
    np.testing.assert_array_equal(first, second)


@pytest.mark.parametrize(("count", "interval"), [(0, 1.0), (5, 0.0), (5, float("nan"))])
def test_nothing_to_draw_is_refused(count, interval):
    with pytest.raises(DataError, match="noise needs samples"):
        draw_noise(NoiseModel(white_fm=1.0), count, interval, np.random.default_rng(1))
