"""The uncertainty budget as bars."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Protocol

from clockgeo.report.numbers import rounded, typeset
from clockgeo.report.style import HATCHES, LIGHT, SERIES, blank, label_axes, picture, shortened

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["BudgetLine", "budget_picture"]

_KINDS = ("statistics", "scatter", "effect", "geodetic", "other")
_SHOWN = 14


class BudgetLine(Protocol):
    """One cause and its part in a standard uncertainty."""

    @property
    def effect(self) -> str:
        """Name of the cause."""

    @property
    def kind(self) -> str:
        """statistics, scatter, effect or geodetic."""

    @property
    def y(self) -> float:
        """Its part as fractional frequency."""

    @property
    def height_mm(self) -> float:
        """Its part in mm of height."""


@picture
def budget_picture(lines: Sequence[BudgetLine], *, title: str = "") -> Figure:
    """Draw each part of an uncertainty as a bar in mm, largest first, the whole on top.

    Parameters
    ----------
    lines : sequence of BudgetLine
        Parts whose squares add up to the square of the whole. Beyond 14 the smallest are drawn as
        one bar.
    title : str
    """
    ordered = sorted(lines, key=lambda line: -line.height_mm)
    shown, rest = ordered[:_SHOWN], ordered[_SHOWN:]
    bars = [(line.effect, line.kind, line.height_mm, line.y) for line in shown]
    if rest:
        bars.append((f"{len(rest)} smaller parts", "other", *_whole(rest)))
    whole = _whole(lines)
    figure, axes = blank(7.0, 1.1 + 0.24 * (len(bars) + 1))
    axes.barh(0, whole[0], height=0.5, facecolor=LIGHT["wash"], edgecolor=LIGHT["ink"], label="u")
    for place, (_, kind, height, _) in enumerate(bars, start=1):
        look = _KINDS.index(kind) if kind in _KINDS else len(_KINDS) - 1
        axes.barh(place, height, height=0.62, facecolor=LIGHT[SERIES[look]], hatch=HATCHES[look])
    for place, (height, y) in enumerate([whole, *((bar[2], bar[3]) for bar in bars)]):
        axes.annotate(
            f"{rounded(height)} mm, {typeset(rounded(y))}",
            (height, place),
            xytext=(4, 0),
            textcoords="offset points",
            va="center",
            fontsize=7.5,
        )
    names = ["whole standard uncertainty", *(shortened(bar[0], 46, tail=20) for bar in bars)]
    axes.set_yticks(range(len(names)), names)
    axes.invert_yaxis()
    axes.set_xlim(0.0, 1.32 * whole[0] or 1.0)
    axes.grid(visible=True, axis="x")
    axes.grid(visible=False, axis="y")
    label_axes(axes, "standard uncertainty of the height difference / mm", "", title)
    _explain(figure, {bar[1] for bar in bars})
    return figure


def _whole(lines: Sequence[BudgetLine]) -> tuple[float, float]:
    """Root of the sum of squares, in mm and as fractional frequency."""
    height = sum(line.height_mm**2 for line in lines) ** 0.5
    return height, sum(line.y**2 for line in lines) ** 0.5


def _explain(figure: Figure, kinds: set[str]) -> None:
    from matplotlib.patches import Patch

    present = [kind for kind in _KINDS if kind in kinds]
    handles = [
        Patch(
            facecolor=LIGHT[SERIES[_KINDS.index(kind)]],
            hatch=HATCHES[_KINDS.index(kind)],
            label=kind,
        )
        for kind in present
    ]
    if len(handles) > 1:
        figure.legend(handles=handles, loc="outside lower left", ncols=len(handles))
