"""Stability: deviations with their intervals, and the fitted noise model."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from clockgeo.campaign.evidence import Curve
from clockgeo.frequency import NoiseModel
from clockgeo.report.style import (
    DASHES,
    LIGHT,
    MARKERS,
    SERIES,
    blank,
    label_axes,
    logarithmic,
    picture,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["in_words", "stability_picture"]

_MATTERS = 0.05
"""Parts of the model are drawn where they reach this share of the whole."""


def in_words(name: str) -> str:
    """Write the name of a statistic or a noise as people do.

    >>> in_words("overlapping-allan"), in_words("random_walk_fm")
    ('overlapping Allan', 'random walk FM')
    """
    words = name.replace("-", " ").replace("_", " ").split()
    special = {"allan": "Allan", "hadamard": "Hadamard", "fm": "FM", "pm": "PM"}
    return " ".join(special.get(word, word) for word in words)


@picture
def stability_picture(
    curves: Sequence[Curve],
    *,
    model: NoiseModel | None = None,
    names: Sequence[str] = (),
    model_name: str = "noise model",
    model_from: float = 0.0,
    title: str = "",
) -> Figure:
    """Draw deviations with their intervals on logarithmic axes.

    Parameters
    ----------
    curves : sequence of Curve
        Drawn with different markers, dashes and colours.
    model : NoiseModel, optional
        Its Allan deviation is drawn over the range of the curves, whole and by its parts.
    names : sequence of str
        What to call the curves; their statistic if not given.
    model_name : str
        What to call the model.
    model_from : float
        Averaging time in s from which on it holds, and is drawn.
    title : str
    """
    figure, axes = blank(7.0, 3.9)
    for place, curve in enumerate(curves):
        name = names[place] if place < len(names) else in_words(curve.statistic)
        _draw_curve(axes, curve, place, name)
    if model is not None:
        reach = np.concatenate([np.asarray(curve.tau, dtype=np.float64) for curve in curves])
        shortest = min(max(float(reach.min()), model_from), float(reach.max()))
        _draw_model(axes, model, shortest, float(reach.max()), model_name)
    logarithmic(axes, "x")
    logarithmic(axes, "y")
    axes.grid(visible=True, which="major", axis="both")
    in_seconds = all("time" in curve.statistic for curve in curves)
    label_axes(
        axes, "averaging time τ / s", f"deviation σ(τ) / {'s' if in_seconds else '1'}", title
    )
    figure.legend(loc="outside lower left", ncols=2)
    return figure


def _draw_curve(axes: Axes, curve: Curve, place: int, name: str) -> None:
    tau, deviation = np.asarray(curve.tau), np.asarray(curve.deviation)
    ends = np.stack([deviation - np.asarray(curve.lower), np.asarray(curve.upper) - deviation])
    # Points computed from phase zero or an interval without an upper end are drawn without bar.
    ends = np.where(np.isfinite(ends) & (ends > 0.0), ends, 0.0)
    axes.errorbar(
        tau,
        deviation,
        yerr=ends,
        color=LIGHT[SERIES[place % len(SERIES)]],
        marker=MARKERS[place % len(MARKERS)],
        markersize=3.8,
        linestyle=DASHES[place % len(DASHES)],
        linewidth=0.7,
        elinewidth=2.2,
        capsize=0.0,
        label=name,
        zorder=3 + place,
    )


def _draw_model(axes: Axes, model: NoiseModel, shortest: float, longest: float, name: str) -> None:
    tau = np.geomspace(shortest, longest, 120)
    whole = np.sqrt(model.allan_variance(tau))
    axes.plot(tau, whole, color=LIGHT["heather"], linewidth=1.8, label=name, zorder=9)
    parts = [
        (level, value) for level, value in model.model_dump().items() if value and level != "drift"
    ]
    if len(parts) < 2:
        return
    for place, (level, value) in enumerate(parts):
        alone = np.sqrt(NoiseModel(**{level: value}).allan_variance(tau))
        matters = alone > whole * _MATTERS
        if not matters.any():
            continue
        axes.plot(
            tau[matters],
            alone[matters],
            color=LIGHT["quiet"],
            linewidth=0.9,
            linestyle=DASHES[1 + place % (len(DASHES) - 1)],
            label=in_words(level),
            zorder=2,
        )
