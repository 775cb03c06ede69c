"""An adjustment: residuals against redundancy, datum offsets, and the plane of each datum."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import NDArray

from clockgeo.report.pictures.places import Background, draw_map
from clockgeo.report.style import (
    LIGHT,
    MARKERS,
    SERIES,
    blank,
    label_axes,
    picture,
    shortened,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["DatumOffset", "PlanePoint", "datum_picture", "observation_picture", "plane_picture"]

_NAMED = 8
"""Up to so many observations beyond the limit carry their names."""


class Observed(Protocol):
    """An observation after adjustment."""

    @property
    def id(self) -> str:
        """Its name."""

    @property
    def kind(self) -> str:
        """Group, such as levelling or gnss."""

    @property
    def standardised(self) -> float | None:
        """Residual over its standard deviation; None where nothing controls it."""

    @property
    def redundancy(self) -> float:
        """Share of an error that shows in the residual, 0 to 1."""


@dataclass(frozen=True)
class DatumOffset:
    """Offset of one datum.

    Attributes
    ----------
    name : str
    offset, u : float or None
        m; None where the data do not determine it.
    """

    name: str
    offset: float | None
    u: float | None


@dataclass(frozen=True)
class PlanePoint:
    """A point of a datum.

    Attributes
    ----------
    name : str
    latitude, longitude : float
        Degrees.
    residual, u : float
        Distance from the datum's plane, m.
    """

    name: str
    latitude: float
    longitude: float
    residual: float
    u: float


@picture
def observation_picture(
    observations: Sequence[Observed], *, limit: float, title: str = ""
) -> Figure:
    """Draw standardised residuals against redundancy numbers.

    What lies at the left is hardly controlled by anything else; what lies beyond the limit
    contradicts the rest.

    Parameters
    ----------
    observations : sequence
        With id, kind, standardised residual and redundancy. Uncontrolled ones sit on the zero line
        at the left, hollow.
    limit : float
        Critical value of the test of a single observation.
    title : str
    """
    figure, axes = blank(7.0, 3.6)
    axes.axhspan(-limit, limit, facecolor=LIGHT["wash"], linewidth=0.0)
    for edge in (-limit, limit):
        axes.axhline(edge, color=LIGHT["quiet"], linewidth=0.8, linestyle="dashed")
    kinds = list(dict.fromkeys(one.kind for one in observations))
    for place, kind in enumerate(kinds):
        group = [one for one in observations if one.kind == kind]
        tested = [(o.redundancy, o.standardised) for o in group if o.standardised is not None]
        loose = [o.redundancy for o in group if o.standardised is None]
        look: dict[str, Any] = {
            "marker": MARKERS[place % len(MARKERS)],
            "markeredgecolor": LIGHT[SERIES[place % len(SERIES)]],
            "linestyle": "none",
            "markersize": 4.0,
        }
        if tested:
            across, up = zip(*tested, strict=True)
            face = LIGHT[SERIES[place % len(SERIES)]]
            axes.plot(across, up, markerfacecolor=face, label=f"{kind} ({len(group)})", **look)
        if loose:
            axes.plot(
                loose,
                [0.0] * len(loose),
                markerfacecolor="none",
                label=f"{kind}, uncontrolled ({len(loose)})",
                **look,
            )
    _name_beyond(axes, observations, limit)
    axes.set_xlim(-0.03, 1.03)
    label_axes(axes, "redundancy number / 1", "standardised residual / 1", title)
    figure.legend(loc="outside lower left", ncols=3)
    return figure


def _name_beyond(axes: Axes, observations: Sequence[Observed], limit: float) -> None:
    beyond = [
        (one.redundancy, one.standardised, one.id)
        for one in observations
        if one.standardised is not None and abs(one.standardised) > limit
    ]
    for across, up, name in sorted(beyond, key=lambda found: -abs(found[1]))[:_NAMED]:
        is_right = across > 0.5
        axes.annotate(
            shortened(name),
            (across, up),
            xytext=(-6 if is_right else 6, 0),
            textcoords="offset points",
            ha="right" if is_right else "left",
            va="center",
            fontsize=7.5,
        )


@picture
def datum_picture(datums: Sequence[DatumOffset], *, title: str = "") -> Figure:
    """Draw the offset of every datum with u (thick) and 2 u (thin).

    Parameters
    ----------
    datums : sequence of DatumOffset
        Those that the data do not determine are named without a mark.
    title : str
    """
    figure, axes = blank(7.0, 1.1 + 0.34 * len(datums))
    axes.axvline(0.0, color=LIGHT["quiet"], linewidth=0.8)
    for place, datum in enumerate(datums):
        if datum.offset is None or datum.u is None:
            axes.annotate(
                "not determined by the data",
                (0.01, place),
                xycoords=axes.get_yaxis_transform(),
                va="center",
                fontsize=7.5,
            )
            continue
        for reach, width in ((2.0, 0.9), (1.0, 3.0)):
            axes.plot(
                [datum.offset - reach * datum.u, datum.offset + reach * datum.u],
                [place, place],
                color=LIGHT["slate"],
                linewidth=width,
                solid_capstyle="butt",
            )
        axes.plot(datum.offset, place, "o", color=LIGHT["slate"], markerfacecolor=LIGHT["paper"])
    axes.set_yticks(range(len(datums)), [shortened(datum.name) for datum in datums])
    axes.set_ylim(len(datums) - 0.5, -0.5)
    axes.margins(x=0.1)
    axes.grid(visible=True, axis="x")
    axes.grid(visible=False, axis="y")
    label_axes(axes, "offset of the datum / m", "", title)
    return figure


@picture
def plane_picture(
    points: Sequence[PlanePoint], plane: Background | None = None, *, title: str = ""
) -> Figure:
    """Draw the residuals of a datum's points as bars on a map, over the datum's plane.

    Parameters
    ----------
    points : sequence of PlanePoint
        Bars go up (filled end) for points above the plane and down (hollow end) below; a thin line
        shows u.
    plane : Background, optional
        The fitted plane as a field, drawn as contour lines.
    title : str
    """
    figure, axes = blank(7.0, 4.2)
    latitude = np.array([point.latitude for point in points])
    longitude = np.array([point.longitude for point in points])
    longitude = draw_map(axes, latitude, longitude, plane)
    largest = max([abs(point.residual) + point.u for point in points], default=0.0)
    low, high = axes.get_ylim()
    scale = 0.12 * (high - low) / largest if largest > 0.0 else 0.0
    for east, point in zip(longitude, points, strict=True):
        _bar(axes, float(east), point, scale)
    _key(axes, largest, scale)
    axes.set_title(title)
    if plane is not None:
        figure.legend(loc="outside lower left")
    return figure


def _bar(axes: Axes, east: float, point: PlanePoint, scale: float) -> None:
    top = point.latitude + scale * point.residual
    ends: NDArray[np.float64] = top + scale * point.u * np.array([-1.0, 1.0])
    axes.plot([east, east], ends, color=LIGHT["quiet"], linewidth=0.7, zorder=3)
    colour = LIGHT["slate"] if point.residual >= 0.0 else LIGHT["clay"]
    axes.plot([east, east], [point.latitude, top], color=colour, linewidth=1.8, zorder=4)
    face = colour if point.residual >= 0.0 else LIGHT["paper"]
    axes.plot(
        east, top, "o", markersize=3.4, markeredgecolor=colour, markerfacecolor=face, zorder=5
    )


def _key(axes: Axes, largest: float, scale: float) -> None:
    """A bar of known length, so that the others can be read."""
    if largest <= 0.0:
        return
    step = 10.0 ** np.floor(np.log10(largest))
    length = max(step * n for n in (1.0, 2.0, 5.0) if step * n <= largest)
    (west, east), (south, north) = axes.get_xlim(), axes.get_ylim()
    across, foot = east - 0.05 * (east - west), south + 0.06 * (north - south)
    axes.plot([across, across], [foot, foot + scale * length], color=LIGHT["ink"], linewidth=1.8)
    axes.annotate(
        f"{1e3 * length:g} mm",
        (across, foot),
        xytext=(-4, 0),
        textcoords="offset points",
        ha="right",
        fontsize=7.5,
    )
