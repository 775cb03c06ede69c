"""A plan: how u falls with time and what stops it, and how it compares with other techniques."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.report.style import (
    DASHES,
    LIGHT,
    MARKERS,
    SERIES,
    blank,
    label_axes,
    logarithmic,
    picture,
    shortened,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["alternatives_picture", "reach_picture"]

_MATTERS = 0.03
"""Parts below this share of the smallest whole limit nothing and are left out."""


@picture
def reach_picture(
    days: ArrayLike,
    u_mm: ArrayLike,
    parts_mm: Mapping[str, ArrayLike],
    *,
    target_mm: float | None = None,
    planned_days: float | None = None,
    title: str = "",
) -> Figure:
    """Draw the predicted u of a height against the time spent, with the parts that limit it.

    Parameters
    ----------
    days : float array, shape (N,)
        Days of measurement, > 0.
    u_mm : float array, shape (N,)
        Predicted standard uncertainty in mm of height.
    parts_mm : mapping of str to float array
        The parts whose squares add up; those that stay level are the limits.
    target_mm : float, optional
        Wanted standard uncertainty.
    planned_days : float, optional
        What the plan has now.
    title : str
    """
    figure, axes = blank(7.0, 3.8)
    across, whole = np.asarray(days, dtype=np.float64), np.asarray(u_mm, dtype=np.float64)
    matters = float(np.min(whole)) * _MATTERS
    parts = {name: np.asarray(part, dtype=np.float64) for name, part in parts_mm.items()}
    parts = {name: part for name, part in parts.items() if np.max(part) > matters}
    for place, (name, part) in enumerate(parts.items()):
        _line(axes, across, part, place, name, width=1.0)
    axes.plot(across, whole, color=LIGHT["ink"], linewidth=2.2, label="whole standard uncertainty")
    if target_mm is not None:
        axes.axhline(target_mm, color=LIGHT["heather"], linewidth=1.2, label="target")
        axes.axhspan(0.0, target_mm, facecolor=LIGHT["wash"], linewidth=0.0, zorder=0)
    if planned_days is not None:
        u_planned = float(np.interp(np.log(planned_days), np.log(across), whole))
        axes.plot(
            planned_days,
            u_planned,
            MARKERS[1],
            color=LIGHT["clay"],
            markersize=8,
            label="as planned",
        )
    logarithmic(axes, "x")
    logarithmic(axes, "y")
    axes.set_ylim(max(axes.get_ylim()[0], matters), 1.6 * float(np.max(whole)))
    axes.grid(visible=True, which="major", axis="both")
    label_axes(axes, "time of measurement / d", "standard uncertainty of height / mm", title)
    figure.legend(loc="outside lower left", ncols=2)
    return figure


@picture
def alternatives_picture(
    kilometres: ArrayLike,
    techniques_mm: Mapping[str, ArrayLike],
    *,
    pairs: Mapping[str, tuple[float, float]] | None = None,
    title: str = "",
) -> Figure:
    """Draw the u of a height difference against distance for several techniques.

    Parameters
    ----------
    kilometres : float array, shape (N,)
        Distances, > 0.
    techniques_mm : mapping of str to float array
        Standard uncertainty in mm of each technique.
    pairs : mapping of str to (kilometres, u in mm), optional
        Pairs of this campaign, drawn as points.
    title : str
    """
    figure, axes = blank(7.0, 3.8)
    across = np.asarray(kilometres, dtype=np.float64)
    for place, (name, u) in enumerate(techniques_mm.items()):
        _line(axes, across, np.asarray(u, dtype=np.float64), place, name, width=1.6)
    for name, (distance, u) in (pairs or {}).items():
        axes.plot(distance, u, MARKERS[1], color=LIGHT["ink"], markersize=6.5, zorder=5)
        axes.annotate(
            shortened(name),
            (distance, u),
            xytext=(6, 4),
            textcoords="offset points",
            fontsize=7.5,
            zorder=6,
        )
    logarithmic(axes, "x")
    logarithmic(axes, "y")
    axes.grid(visible=True, which="major", axis="both")
    label_axes(axes, "distance / km", "standard uncertainty of height difference / mm", title)
    figure.legend(loc="outside lower left", ncols=2)
    return figure


def _line(
    axes: Axes,
    across: NDArray[np.float64],
    up: NDArray[np.float64],
    place: int,
    name: str,
    *,
    width: float,
) -> None:
    axes.plot(
        across,
        np.where(up > 0.0, up, np.nan),
        color=LIGHT[SERIES[place % len(SERIES)]],
        linestyle=DASHES[place % len(DASHES)],
        marker=MARKERS[place % len(MARKERS)],
        markevery=(place, max(1, across.size // 5)),
        markersize=4.0,
        linewidth=width,
        label=shortened(name, 40, tail=16),
    )
