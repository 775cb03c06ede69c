"""Map of sites and what connects them: a plain graticule, no tiles from anywhere."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.report.style import LIGHT, MARKERS, blank, picture

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["Background", "MapSite", "draw_map", "map_extent", "site_map"]

_KM_PER_DEGREE = 111.2
_SMALLEST_SPAN = 0.02
_SHAPE = 1.9
"""Width over height of the map."""
_CROWDED = 4
"""Beyond so many pairs of sites, lines of one session carry no label."""


@dataclass(frozen=True)
class MapSite:
    """A place on the map.

    Attributes
    ----------
    name : str
    latitude, longitude : float
        Degrees.
    note : str
        A second line under the name, such as a height with its u.
    reference : bool
        Whether its geopotential number is taken as known.
    """

    name: str
    latitude: float
    longitude: float
    note: str = ""
    reference: bool = False


@dataclass(frozen=True, eq=False)
class Background:
    """A field under the map, such as the geoid.

    Attributes
    ----------
    latitude, longitude : float arrays, shapes (M,), (N,)
        Degrees, increasing.
    values : float array, shape (M, N)
    label : str
        Quantity with unit, such as "height anomaly / m".
    """

    latitude: NDArray[np.float64]
    longitude: NDArray[np.float64]
    values: NDArray[np.float64]
    label: str


@picture
def site_map(
    sites: Sequence[MapSite],
    connections: Sequence[tuple[str, str]] = (),
    *,
    background: Background | None = None,
    span: float = _SMALLEST_SPAN,
    title: str = "",
) -> Figure:
    """Draw sites in a plain local projection with a scale bar.

    Parameters
    ----------
    sites : sequence of MapSite
    connections : sequence of (str, str)
        Names of the two sites of each session; equal names are sessions in one place. Lines are
        labelled with their number of sessions.
    background : Background, optional
        Drawn as contour lines with labels.
    span : float
        Smallest height of the map in degrees, before room is added for labels.
    title : str
    """
    figure, axes = blank(7.0, 4.0)
    latitude = np.array([site.latitude for site in sites])
    longitudes = np.array([site.longitude for site in sites])
    longitude = draw_map(axes, latitude, longitudes, background, span=span)
    at = {s.name: (x, y) for s, x, y in zip(sites, longitude, latitude, strict=True)}
    _connections(axes, at, connections)
    here = Counter(first for first, second in connections if first == second)
    for site in sites:
        _site(axes, site, at[site.name], here[site.name])
    if background is not None:
        figure.legend(loc="outside lower left")
    axes.set_title(title)
    return figure


def draw_map(
    axes: Axes,
    latitude: NDArray[np.float64],
    longitude: NDArray[np.float64],
    background: Background | None = None,
    *,
    span: float = _SMALLEST_SPAN,
) -> NDArray[np.float64]:
    """Draw graticule, scale bar and background of a map that holds the given points.

    Returns
    -------
    float array, shape (N,)
        Longitudes as they are drawn, without a jump at the antimeridian.
    """
    west, east, south, north = map_extent(latitude, longitude, span=span)
    stretch = _stretch(latitude)
    axes.set_xlim(west, east)
    axes.set_ylim(south, north)
    axes.set_aspect(1.0 / stretch, adjustable="box", anchor="W")
    axes.grid(visible=True, axis="both")
    for side in ("top", "right"):
        axes.spines[side].set_visible(True)
    if background is not None:
        _contours(axes, background)
    _scale_bar(axes, stretch)
    _degrees(axes)
    return _unwrapped(longitude)


def map_extent(
    latitude: NDArray[np.float64], longitude: NDArray[np.float64], *, span: float = _SMALLEST_SPAN
) -> tuple[float, float, float, float]:
    """West, east, south and north of the map that holds these points, in degrees.

    There is room around the points for their labels. Longitudes run on past 180 where the map
    crosses the antimeridian.
    """
    drawn, stretch = _unwrapped(longitude), _stretch(latitude)
    height = max(float(np.ptp(latitude)), float(np.ptp(drawn)) * stretch / 2.2, span)
    width = max(float(np.ptp(drawn)), height * 1.6 / stretch)
    half_up = max(0.85 * height, 0.75 * width * stretch / _SHAPE)
    half_across = half_up * _SHAPE / stretch
    centre = float(drawn.max() + drawn.min()) / 2.0
    middle = float(latitude.max() + latitude.min()) / 2.0
    return centre - half_across, centre + half_across, middle - half_up, middle + half_up


def _unwrapped(longitude: NDArray[np.float64]) -> NDArray[np.float64]:
    """Keep points on both sides of the antimeridian together."""
    angles = np.radians(longitude)
    middle = float(np.degrees(np.arctan2(np.sin(angles).mean(), np.cos(angles).mean())))
    return np.asarray(middle + (longitude - middle + 180.0) % 360.0 - 180.0)


def _stretch(latitude: NDArray[np.float64]) -> float:
    """Length of a degree of longitude in degrees of latitude; never quite zero."""
    return float(np.cos(np.radians(np.clip(latitude.mean(), -85.0, 85.0))))


def _contours(axes: Axes, background: Background) -> None:
    lines = axes.contour(
        background.longitude,
        background.latitude,
        background.values,
        levels=8,
        colors=LIGHT["lichen"],
        linestyles="solid",
        linewidths=0.7,
    )
    axes.clabel(lines, fontsize=7.0, fmt=lambda value: f"{value:g}".replace("-", "−"))
    axes.plot([], [], color=LIGHT["lichen"], linewidth=0.7, label=background.label)


def _connections(
    axes: Axes, at: dict[str, tuple[float, float]], connections: Sequence[tuple[str, str]]
) -> None:
    counts = Counter(tuple(sorted(pair)) for pair in connections)
    for (first, second), count in sorted(counts.items()):
        (x1, y1), (x2, y2) = at[first], at[second]
        if (x1, y1) == (x2, y2):
            axes.plot(x1, y1, "o", markersize=16, markerfacecolor="none", color=LIGHT["slate"])
            continue
        axes.plot([x1, x2], [y1, y2], color=LIGHT["slate"], linewidth=1.5, zorder=2)
        if count == 1 and len(counts) > _CROWDED:
            continue  # A star of single sessions would be all labels.
        axes.annotate(
            _sessions(count),
            ((x1 + x2) / 2.0, (y1 + y2) / 2.0),
            ha="center",
            va="center",
            fontsize=7.5,
            bbox={"facecolor": LIGHT["paper"], "edgecolor": LIGHT["rule"], "pad": 2.0},
        )


def _site(axes: Axes, site: MapSite, place: tuple[float, float], sessions: int) -> None:
    """A marker and its label, which grows away from the middle of the map upwards or downwards."""
    marker, size = (MARKERS[2], 7.0) if site.reference else (MARKERS[3], 8.0)
    face = LIGHT["paper"] if site.reference else LIGHT["clay"]
    axes.plot(
        *place,
        marker,
        markersize=size,
        markerfacecolor=face,
        markeredgecolor=LIGHT["clay"],
        markeredgewidth=1.5,
        zorder=4,
    )
    lines = [site.name + (" (reference)" if site.reference else "")]
    lines += [site.note] if site.note else []
    lines += [f"{_sessions(sessions)} here"] if sessions else []
    is_left = place[0] <= sum(axes.get_xlim()) / 2.0
    is_high = place[1] >= sum(axes.get_ylim()) / 2.0
    axes.annotate(
        "\n".join(lines),
        place,
        xytext=(-9 if is_left else 9, 11 if is_high else -11),
        textcoords="offset points",
        ha="left" if is_left else "right",
        va="bottom" if is_high else "top",
        fontsize=8.0,
        bbox={"facecolor": LIGHT["paper"], "edgecolor": "none", "alpha": 0.8, "pad": 1.0},
        zorder=5,
    )


def _sessions(count: int) -> str:
    return f"{count} session{'s' if count > 1 else ''}"


def _scale_bar(axes: Axes, stretch: float) -> None:
    """A round number of kilometres near a quarter of the width."""
    low, high = axes.get_xlim()
    wanted = (high - low) * stretch * _KM_PER_DEGREE / 4.0
    step = 10.0 ** np.floor(np.log10(wanted))
    length = max(step * n for n in (1.0, 2.0, 5.0) if step * n <= wanted)
    share = length / _KM_PER_DEGREE / stretch / (high - low)
    axes.plot(
        [0.03, 0.03 + share],
        [0.06, 0.06],
        transform=axes.transAxes,
        color=LIGHT["ink"],
        linewidth=2.2,
        solid_capstyle="butt",
    )
    axes.text(0.03, 0.08, f"{length:g} km", transform=axes.transAxes, fontsize=7.5)


def _degrees(axes: Axes) -> None:
    from matplotlib.ticker import FuncFormatter

    def east(value: float, _: int) -> str:
        wrapped = (value + 180.0) % 360.0 - 180.0
        return f"{abs(wrapped):.6g}° {'E' if wrapped >= 0.0 else 'W'}"

    def north(value: float, _: int) -> str:
        return f"{abs(value):.6g}° {'N' if value >= 0.0 else 'S'}" if abs(value) <= 90.0 else ""

    axes.xaxis.set_major_formatter(FuncFormatter(east))
    axes.yaxis.set_major_formatter(FuncFormatter(north))
    axes.locator_params(axis="both", nbins=6)
