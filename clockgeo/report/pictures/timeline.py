"""Timeline of a campaign: where each clock stood, and when it was compared."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from clockgeo.report.envelope import days_utc
from clockgeo.report.style import (
    HATCHES,
    LIGHT,
    SERIES,
    blank,
    label_axes,
    picture,
    shortened,
    time_axis,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["TimelineSession", "timeline_picture"]

_LABELLED = 16
"""Up to so many sessions carry their names."""
_NAME_LEVELS = 2
_CHARACTER = 0.0105
"""Width of a letter of a name, as a share of the axis."""


@dataclass(frozen=True)
class TimelineSession:
    """One session on the timeline.

    Attributes
    ----------
    name : str
    start, stop : int
        TAI nanoseconds.
    clocks, sites : tuple of (str, str)
        Numerator and denominator.
    uptime : float
        Share of valid time.
    """

    name: str
    start: int
    stop: int
    clocks: tuple[str, str]
    sites: tuple[str, str]
    uptime: float


@picture
def timeline_picture(sessions: Sequence[TimelineSession], *, title: str = "") -> Figure:
    """Draw one lane a clock: a thin line for each stay at a site, a block for each session.

    Dotted lines are moves. The filled height of a block is the uptime. Sites differ by colour,
    hatch and label.

    Parameters
    ----------
    sessions : sequence of TimelineSession
    title : str
    """
    ordered = sorted(sessions, key=lambda one: one.start)
    clocks = list(dict.fromkeys(clock for one in ordered for clock in one.clocks))
    sites = sorted({site for one in ordered for site in one.sites})
    figure, axes = blank(7.0, 1.15 + 0.55 * len(clocks))
    for lane, clock in enumerate(clocks):
        _draw_stays(axes, ordered, clock, lane, sites)
        for one in ordered:
            if clock in one.clocks:
                _draw_session(axes, one, lane, sites.index(one.sites[one.clocks.index(clock)]))
    if len(ordered) <= _LABELLED:
        for one, level in zip(ordered, _levels(axes, ordered), strict=True):
            _name(axes, one, level)
    axes.set_yticks(range(len(clocks)), [shortened(clock) for clock in clocks])
    axes.set_ylim(len(clocks) - 0.45, -1.05 if len(ordered) <= _LABELLED else -0.6)
    axes.grid(visible=True, axis="x")
    axes.grid(visible=False, axis="y")
    time_axis(axes)
    label_axes(axes, "time (UTC)", "", title)
    _explain(figure, sites)
    return figure


def _look(site: int) -> dict[str, str]:
    """Colour and hatch; with each round of the colours the hatches shift by one."""
    return {
        "facecolor": LIGHT[SERIES[site % len(SERIES)]],
        "hatch": HATCHES[(site + site // len(SERIES)) % len(HATCHES)],
        "edgecolor": LIGHT[SERIES[site % len(SERIES)]],
    }


def _draw_stays(
    axes: Axes, ordered: Sequence[TimelineSession], clock: str, lane: int, sites: Sequence[str]
) -> None:
    """Lines from the first to the last session of each stay."""
    visits = [
        (one.start, one.stop, sites.index(one.sites[one.clocks.index(clock)]))
        for one in ordered
        if clock in one.clocks
    ]
    start, stop, site = visits[0]
    for next_start, next_stop, next_site in [*visits[1:], (0, 0, -1)]:
        if next_site == site:
            stop = max(stop, next_stop)
            continue
        if next_site >= 0:
            _draw_move(axes, stop, next_start, lane)
        axes.plot(
            days_utc(np.array([start, stop])),
            [lane + 0.32, lane + 0.32],
            color=LIGHT[SERIES[site % len(SERIES)]],
            linewidth=1.6,
            solid_capstyle="butt",
        )
        start, stop, site = next_start, next_stop, next_site


def _draw_move(axes: Axes, start: int, stop: int, lane: int) -> None:
    """A dotted line where the clock is on its way."""
    axes.plot(
        days_utc(np.array([start, stop])),
        [lane + 0.32, lane + 0.32],
        color=LIGHT["quiet"],
        linewidth=1.2,
        linestyle=(0, (1, 1.5)),
    )


def _draw_session(axes: Axes, one: TimelineSession, lane: int, site: int) -> None:
    left, right = days_utc(np.array([one.start, one.stop])).tolist()
    height = 0.5
    look = _look(site)
    axes.bar(
        left,
        height,
        width=right - left,
        bottom=lane - 0.25,
        align="edge",
        facecolor=LIGHT["wash"],
        edgecolor=look["edgecolor"],
        linewidth=0.7,
    )
    filled = height * one.uptime
    axes.bar(
        left,
        filled,
        width=right - left,
        bottom=lane + 0.25 - filled,
        align="edge",
        facecolor=look["facecolor"],
        hatch=look["hatch"],
        linewidth=0.0,
    )


def _levels(axes: Axes, ordered: Sequence[TimelineSession]) -> list[int]:
    """Heights of the names, so that neighbours do not cover each other where there is room."""
    low, high = axes.get_xlim()
    free_from = [low] * _NAME_LEVELS
    levels: list[int] = []
    for one in ordered:
        middle = float(days_utc(np.array([one.start, one.stop])).mean())
        half = 0.5 * _CHARACTER * (high - low) * len(shortened(one.name, 16))
        level = next((n for n, free in enumerate(free_from) if free <= middle - half), 0)
        free_from[level] = middle + half
        levels.append(level)
    return levels


def _name(axes: Axes, one: TimelineSession, level: int) -> None:
    middle = float(days_utc(np.array([one.start, one.stop])).mean())
    axes.annotate(
        shortened(one.name, 16),
        (middle, -0.32 - 0.24 * level),
        ha="center",
        va="bottom",
        fontsize=7.0,
        rotation=0,
    )


def _explain(figure: Figure, sites: Sequence[str]) -> None:
    from matplotlib.patches import Patch

    handles = [
        Patch(
            facecolor=_look(place)["facecolor"],
            hatch=_look(place)["hatch"],
            label=f"at {shortened(site)}",
        )
        for place, site in enumerate(sites)
    ]
    handles.append(
        Patch(facecolor=LIGHT["wash"], edgecolor=LIGHT["quiet"], label="no valid data in session")
    )
    figure.legend(handles=handles, loc="outside lower left", ncols=4)
