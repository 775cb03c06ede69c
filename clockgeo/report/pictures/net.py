"""Map of a height network: points, lines, clock sites and what is suspected."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from clockgeo.report.pictures.places import draw_map
from clockgeo.report.style import LIGHT, blank, picture, shortened

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["NetPoint", "net_picture"]

_NAMED = 12
"""Up to so many clock sites carry their names."""
_MANY = 20_000
"""Beyond so many lines or points they are drawn as an image within the picture."""


@dataclass(frozen=True)
class NetPoint:
    """A point of the network.

    Attributes
    ----------
    name : str
    latitude, longitude : float
        Degrees.
    has_clock : bool
        Whether a clock was there.
    is_known : bool
        Whether the data determine its number.
    """

    name: str
    latitude: float
    longitude: float
    has_clock: bool = False
    is_known: bool = True


@picture
def net_picture(
    points: Sequence[NetPoint],
    lines: Sequence[tuple[str, str]] = (),
    suspected: Sequence[tuple[str, str]] = (),
    *,
    title: str = "",
) -> Figure:
    """Draw a network.

    Parameters
    ----------
    points : sequence of NetPoint
    lines : sequence of (str, str)
        Names of the ends of observed differences.
    suspected : sequence of (str, str)
        Those among them that are suspected of a blunder.
    title : str
    """
    figure, axes = blank(7.0, 4.4)
    latitude = np.array([point.latitude for point in points])
    longitude = draw_map(axes, latitude, np.array([point.longitude for point in points]))
    at = {
        point.name: (float(x), float(y))
        for point, x, y in zip(points, longitude, latitude, strict=True)
    }
    _draw_lines(axes, at, lines, "lichen", 0.8, f"observed differences ({len(lines)})")
    _draw_lines(axes, at, suspected, "heather", 3.0, f"suspected ({len(suspected)})")
    _ring(axes, at, suspected)
    looks = (
        ("points", [p for p in points if p.is_known and not p.has_clock], ".", "slate", "slate"),
        ("not determined", [p for p in points if not p.is_known], "x", "clay", "clay"),
        ("clock sites", [p for p in points if p.has_clock and p.is_known], "^", "clay", "clay"),
    )
    for name, chosen, marker, edge, face in looks:
        if chosen:
            across, up = zip(*(at[point.name] for point in chosen), strict=True)
            axes.plot(
                across,
                up,
                marker,
                markersize=7.0 if marker == "^" else 4.0,
                markeredgecolor=LIGHT[edge],
                markerfacecolor=LIGHT[face],
                rasterized=len(chosen) > _MANY,
                label=f"{name} ({len(chosen)})",
                zorder=4,
            )
    _name_sites(axes, points, at)
    axes.set_title(title)
    figure.legend(loc="outside lower left", ncols=4)
    return figure


def _draw_lines(
    axes: Axes,
    at: dict[str, tuple[float, float]],
    lines: Sequence[tuple[str, str]],
    colour: str,
    width: float,
    label: str,
) -> None:
    from matplotlib.collections import LineCollection

    ends = [(at[first], at[second]) for first, second in lines if first in at and second in at]
    if ends:
        axes.add_collection(
            LineCollection(
                ends,
                colors=LIGHT[colour],
                linewidths=width,
                label=label,
                rasterized=len(ends) > _MANY,
                zorder=2,
            ),
            autolim=False,
        )


def _ring(axes: Axes, at: dict[str, tuple[float, float]], lines: Sequence[tuple[str, str]]) -> None:
    """Ring the middle of lines: a short one between many points would not be seen."""
    middles = [
        np.mean([at[first], at[second]], axis=0)
        for first, second in lines
        if first in at and second in at
    ]
    if middles:
        across, up = np.transpose(middles)
        axes.plot(
            across,
            up,
            "o",
            markersize=16.0,
            markerfacecolor="none",
            markeredgecolor=LIGHT["heather"],
            markeredgewidth=2.0,
            zorder=5,
        )


def _name_sites(axes: Axes, points: Sequence[NetPoint], at: dict[str, tuple[float, float]]) -> None:
    sites = [point for point in points if point.has_clock]
    for point in sites if len(sites) <= _NAMED else ():
        axes.annotate(
            shortened(point.name),
            at[point.name],
            xytext=(6, 5),
            textcoords="offset points",
            fontsize=7.5,
            bbox={"facecolor": LIGHT["paper"], "edgecolor": "none", "alpha": 0.8, "pad": 0.5},
            zorder=5,
        )
