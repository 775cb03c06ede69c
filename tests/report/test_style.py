"""The look: colours that stay apart for everybody, and on both papers."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from clockgeo.report.style import DARK, DASHES, HATCHES, LIGHT, MARKERS, SERIES, power_of_ten

# Dichromatic sight in linear RGB, severity 1.0: Machado, Oliveira & Fernandes 2009, IEEE Trans.
# Vis. Comput. Graph. 15, 1291, table 1; from memory.
SIGHTS = {
    "usual": np.eye(3),
    "protan": np.array(
        [
            [0.152286, 1.052583, -0.204868],
            [0.114503, 0.786281, 0.099216],
            [-0.003882, -0.048116, 1.051998],
        ]
    ),
    "deutan": np.array(
        [
            [0.367322, 0.860646, -0.227968],
            [0.280085, 0.672501, 0.047413],
            [-0.011820, 0.042940, 0.968881],
        ]
    ),
    "tritan": np.array(
        [
            [1.255528, -0.076749, -0.178779],
            [-0.078411, 0.930809, 0.147602],
            [0.004733, 0.691367, 0.303900],
        ]
    ),
}
APART = 15.0  # CIE 1976 colour difference; 2.3 is just noticeable (common practice, no source)


def linear(colour: str) -> np.ndarray:
    """sRGB to linear light, IEC 61966-2-1."""
    c = np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)]) / 255.0
    return np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)


def lab(light: np.ndarray) -> np.ndarray:
    """Linear sRGB to CIE 1976 L*a*b* with white D65."""
    to_xyz = np.array(
        [
            [0.4124564, 0.3575761, 0.1804375],
            [0.2126729, 0.7151522, 0.0721750],
            [0.0193339, 0.1191920, 0.9503041],
        ]
    )
    ratio = to_xyz @ light / np.array([0.95047, 1.0, 1.08883])
    f = np.where(ratio > 0.008856, np.cbrt(ratio), 7.787 * ratio + 16.0 / 116.0)
    return np.array([116.0 * f[1] - 16.0, 500.0 * (f[0] - f[1]), 200.0 * (f[1] - f[2])])


def contrast(one: str, other: str) -> float:
    """Contrast ratio of WCAG 2.1."""
    weights = np.array([0.2126, 0.7152, 0.0722])
    dark, light = sorted(float(weights @ linear(colour)) for colour in (one, other))
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
@pytest.mark.parametrize("sight", SIGHTS)
def test_series_colours_stay_apart(palette, sight):
    seen = {n: lab(np.clip(SIGHTS[sight] @ linear(palette[n]), 0.0, 1.0)) for n in SERIES}
    distances = {
        (a, b): float(np.linalg.norm(seen[a] - seen[b])) for a, b in combinations(SERIES, 2)
    }
    assert min(distances.values()) > APART, distances


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
def test_text_and_lines_stand_out(palette):
    # WCAG 2.1: 4.5 for text (1.4.3), 3 for graphical objects (1.4.11)
    for paper in ("paper", "wash"):
        assert contrast(palette["ink"], palette[paper]) > 7.0
        assert contrast(palette["quiet"], palette[paper]) > 4.5
    for name in SERIES:
        assert contrast(palette[name], palette["paper"]) > 3.0


def test_every_series_differs_without_colour():
    assert len(set(MARKERS)) == len(set(DASHES)) == len(set(HATCHES)) == len(SERIES)


def test_papers_have_the_same_colours_and_each_colour_one_name():
    assert LIGHT.keys() == DARK.keys()
    assert len(set(LIGHT.values())) == len(LIGHT)


@pytest.mark.parametrize(
    ("largest", "exponent"), [(3e-16, -18), (1e-15, -15), (999.0, 0), (0.0, 0), (2e-18, -18)]
)
def test_powers_of_ten_come_in_threes(largest, exponent):
    assert power_of_ten([-largest, float("nan")]) == exponent
