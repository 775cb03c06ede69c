"""Clocks against geodesy, residuals of sessions, and correlations."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from clockgeo.campaign.results import Comparison, SessionResult
from clockgeo.report.numbers import raised, typeset, with_uncertainty
from clockgeo.report.style import (
    LIGHT,
    MARKERS,
    blank,
    label_axes,
    picture,
    power_of_ten,
    shortened,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["comparison_picture", "correlation_picture", "residual_picture"]


_NUMBERED = 12
"""Up to so many places the numbers are written beside the squares."""


@picture
def comparison_picture(lines: Sequence[Comparison], *, title: str = "") -> Figure:
    """Draw each pair twice about the geodetic value: geodesy and clocks, with 1 u and 2 u.

    Parameters
    ----------
    lines : sequence of Comparison
    title : str
    """
    figure, axes = blank(7.0, 1.25 + 0.62 * len(lines))
    for place, line in enumerate(lines):
        _whisker(axes, 0.0, line.u_geodetic, place + 0.14, "lichen", MARKERS[2], "geodesy")
        _whisker(axes, line.difference, line.u_clock, place - 0.14, "slate", MARKERS[0], "clocks")
        written = typeset(with_uncertainty(line.difference, line.u, "m² s⁻²"))
        axes.annotate(
            f"clocks − geodesy = {written}",
            (0.99, place - 0.36),
            xycoords=axes.get_yaxis_transform(),
            ha="right",
            va="center",
            fontsize=7.5,
        )
    axes.axvline(0.0, color=LIGHT["quiet"], linewidth=0.8)
    axes.set_yticks(
        range(len(lines)),
        [f"{shortened(one.from_site)} → {shortened(one.to_site)}" for one in lines],
    )
    axes.set_ylim(len(lines) - 0.55, -0.6)
    axes.margins(x=0.12)
    axes.grid(visible=True, axis="x")
    axes.grid(visible=False, axis="y")
    label_axes(axes, "difference from the geodetic value / m² s⁻²", "", title)
    handles, labels = axes.get_legend_handles_labels()
    figure.legend(handles[:2], labels[:2], loc="outside lower left", ncols=2)
    return figure


def _whisker(
    axes: Axes, value: float, u: float, place: float, colour: str, marker: str, name: str
) -> None:
    """A thick bar for one standard uncertainty, a thin one for two."""
    axes.plot([value - 2 * u, value + 2 * u], [place, place], color=LIGHT[colour], linewidth=0.9)
    axes.plot(
        [value - u, value + u],
        [place, place],
        color=LIGHT[colour],
        linewidth=3.0,
        solid_capstyle="butt",
    )
    axes.plot(
        value,
        place,
        marker,
        color=LIGHT[colour],
        markerfacecolor=LIGHT["paper"],
        markersize=6.0,
        label=f"{name}: ± u thick, ± 2 u thin",
    )


@picture
def residual_picture(sessions: Sequence[SessionResult], *, title: str = "") -> Figure:
    """Draw the residual of every session with its statistical u (thick) and whole u (thin).

    Parameters
    ----------
    sessions : sequence of SessionResult
    title : str
    """
    exponent = power_of_ten([abs(s.residual) + s.u for s in sessions])
    unit = 10.0**exponent
    figure, axes = blank(7.0, 2.6)
    place = np.arange(len(sessions))
    residual = np.array([s.residual for s in sessions]) / unit
    axes.axhline(0.0, color=LIGHT["quiet"], linewidth=0.8)
    for u, width, name in (
        ([s.u for s in sessions], 0.9, "whole u"),
        ([s.u_statistical for s in sessions], 3.0, "statistical u"),
    ):
        axes.errorbar(
            place,
            residual,
            yerr=np.array(u) / unit,
            fmt="none",
            ecolor=LIGHT["slate"],
            elinewidth=width,
            label=name,
        )
    axes.plot(place, residual, "o", color=LIGHT["slate"], markerfacecolor=LIGHT["paper"])
    _name_places(axes, [s.id for s in sessions])
    label_axes(axes, "session", f"residual / {raised(exponent)}", title)
    figure.legend(loc="outside lower left", ncols=2)
    return figure


def _name_places(axes: Axes, names: Sequence[str], most: int = 40) -> None:
    """Put names under places; beyond `most` only every so manieth."""
    names = [shortened(name, 18) for name in names]
    step = max(1, -(-len(names) // most))
    rotation = 0 if len(names) <= 8 and max(map(len, names)) <= 12 else 90
    axes.set_xticks(range(0, len(names), step), names[::step], rotation=rotation)


@picture
def correlation_picture(names: Sequence[str], covariance: ArrayLike, *, title: str = "") -> Figure:
    """Draw the correlations of a covariance matrix as squares, whose area is the size.

    Filled squares are positive, hollow ones negative. Up to twelve places, the upper half holds the
    numbers.

    Parameters
    ----------
    names : sequence of str, length K
    covariance : float array, shape (K, K)
        Places without variance have no correlation and stay empty.
    title : str
    """
    matrix = np.asarray(covariance, dtype=np.float64)
    deviation = np.sqrt(np.diag(matrix))
    size = len(names)
    figure, axes = blank(min(7.0, 2.4 + 0.62 * size), min(6.6, 1.5 + 0.55 * size))
    for row in range(size):
        for column in range(row):
            scale = deviation[row] * deviation[column]
            if scale > 0.0:
                correlation = float(matrix[row, column] / scale)
                _square(axes, row, column, correlation)
                if size <= _NUMBERED:
                    written = f"{correlation:+.2f}".replace("-", "−")
                    axes.text(row, column, written, ha="center", va="center", fontsize=8.0)
    axes.set_xlim(-0.6, size - 0.4)
    axes.set_ylim(size - 0.4, -0.6)
    axes.set_aspect("equal")
    axes.set_yticks(range(size), [shortened(name) for name in names])
    axes.set_xticks(range(size), [shortened(name) for name in names], rotation=90)
    axes.grid(visible=False)
    axes.set_title(title)
    return figure


def _square(axes: Axes, row: int, column: int, correlation: float) -> None:
    from matplotlib.patches import Rectangle

    side = 0.9 * min(abs(correlation), 1.0) ** 0.5
    positive = correlation >= 0.0
    axes.add_patch(
        Rectangle(
            (column - side / 2.0, row - side / 2.0),
            side,
            side,
            facecolor=LIGHT["lake"] if positive else LIGHT["paper"],
            edgecolor=LIGHT["lake"] if positive else LIGHT["clay"],
            linewidth=1.2,
        )
    )
