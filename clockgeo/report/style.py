"""The look of pictures and page: colours, type and lines, decided once.

Five series colours, named after things of the ground, differ for normal and colour-deficient sight
alike, and every series also has its own marker, dash and hatch: nothing is told by colour alone.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import wraps
from typing import TYPE_CHECKING, Any, ParamSpec, TypeVar

import numpy as np
from numpy.typing import ArrayLike

from clockgeo.report.numbers import raised

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "DARK",
    "DASHES",
    "HATCHES",
    "LIGHT",
    "MARKERS",
    "SERIES",
    "blank",
    "drawing",
    "label_axes",
    "logarithmic",
    "picture",
    "power_of_ten",
    "shortened",
    "time_axis",
]

LIGHT = {
    "paper": "#fcfbf7",
    "wash": "#efede4",
    "rule": "#d5d2c6",
    "quiet": "#5a6470",
    "ink": "#1a222c",
    "slate": "#283556",
    "clay": "#bd4310",
    "lake": "#1489ab",
    "heather": "#bf2a8c",
    "lichen": "#877a4c",
}
"""Colours on light paper; pictures are drawn with these."""

DARK = {
    "paper": "#12181f",
    "wash": "#1d262f",
    "rule": "#36414c",
    "quiet": "#a3afbb",
    "ink": "#e9ecee",
    "slate": "#4f93ea",
    "clay": "#fac6a2",
    "lake": "#86dff2",
    "heather": "#d3649f",
    "lichen": "#9a8455",
}
"""The same names on dark paper; the page swaps them in."""

SERIES = ("slate", "clay", "lake", "heather", "lichen")
MARKERS = ("o", "D", "s", "^", "v")
DASHES = ("solid", (0, (6, 2)), (0, (2, 1.5)), (0, (7, 2, 1.5, 2)), (0, (1, 2.5)))
HATCHES = ("", "////", "||||", "\\\\\\\\", "----")

_RC: dict[str, Any] = {
    "axes.axisbelow": True,
    "axes.edgecolor": LIGHT["quiet"],
    "axes.facecolor": "none",
    "axes.grid": True,
    "axes.grid.axis": "y",
    "axes.labelcolor": LIGHT["ink"],
    "axes.labelsize": 8.5,
    "axes.linewidth": 0.7,
    "axes.spines.right": False,
    "axes.spines.top": False,
    "axes.titlecolor": LIGHT["ink"],
    "axes.titlelocation": "left",
    "axes.titlesize": 9.5,
    "axes.titleweight": "bold",
    "figure.facecolor": LIGHT["paper"],
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 8.5,
    "grid.color": LIGHT["rule"],
    "grid.linewidth": 0.6,
    "hatch.color": LIGHT["paper"],
    "hatch.linewidth": 0.7,
    "legend.fontsize": 8.0,
    "legend.frameon": False,
    "legend.handlelength": 2.6,
    "lines.linewidth": 1.3,
    "lines.markersize": 4.5,
    "path.simplify": True,
    "pdf.fonttype": 42,
    "savefig.dpi": 150,
    "savefig.facecolor": LIGHT["paper"],
    "svg.fonttype": "none",
    "svg.hashsalt": "clockgeo",
    "text.color": LIGHT["ink"],
    "text.parse_math": False,
    "timezone": "UTC",
    "xtick.color": LIGHT["quiet"],
    "xtick.labelcolor": LIGHT["ink"],
    "xtick.labelsize": 8.0,
    "xtick.major.size": 3.0,
    "xtick.minor.size": 1.5,
    "ytick.color": LIGHT["quiet"],
    "ytick.labelcolor": LIGHT["ink"],
    "ytick.labelsize": 8.0,
    "ytick.major.size": 0.0,
    "ytick.minor.size": 0.0,
}

P = ParamSpec("P")
R = TypeVar("R")


@contextmanager
def drawing() -> Iterator[None]:
    """Draw or save in the project's look, whatever the user's own settings are."""
    import matplotlib as mpl

    with mpl.rc_context():
        mpl.rcdefaults()
        for name, value in _RC.items():
            mpl.rcParams[name] = value  # type: ignore[index]
        yield


def picture(draw: Callable[P, R]) -> Callable[P, R]:
    """Make a function draw in the project's look."""

    @wraps(draw)
    def drawn(*arguments: P.args, **options: P.kwargs) -> R:
        with drawing():
            return draw(*arguments, **options)

    return drawn


def blank(width: float = 7.0, height: float = 2.8) -> tuple[Figure, Axes]:
    """Return a figure of that size in inches with one pair of axes; no window is ever opened."""
    from matplotlib.figure import Figure
    from matplotlib.layout_engine import ConstrainedLayoutEngine

    engine = ConstrainedLayoutEngine(w_pad=0.06, h_pad=0.07)
    figure = Figure(figsize=(width, height), layout=engine)
    return figure, figure.add_subplot()


def label_axes(axes: Axes, across: str, up: str, title: str = "") -> None:
    """Name both axes, each with its unit after a slash."""
    axes.set_xlabel(across)
    axes.set_ylabel(up)
    axes.set_title(title)


def shortened(name: str, limit: int = 24, *, tail: int = 0) -> str:
    """Cut a long name for an axis, all but its last `tail` letters; the tables have it whole.

    >>> shortened("a very long name of a clock", 12)
    'a very long…'
    >>> shortened("density, first stay", 12, tail=4)
    'density…stay'
    """
    if len(name) <= limit:
        return name
    return f"{name[: limit - tail - 1]}…{name[len(name) - tail :]}"


def power_of_ten(values: ArrayLike) -> int:
    """Exponent that brings the largest of `values` between 1 and 1000, in steps of three."""
    sizes = np.abs(np.asarray(values, dtype=np.float64))
    sizes = sizes[np.isfinite(sizes)]
    largest = float(sizes.max()) if sizes.size else 0.0
    return 3 * int(np.floor(np.log10(largest) / 3.0)) if largest > 0.0 else 0


def logarithmic(axes: Axes, which: str) -> None:
    """Make the x or y axis logarithmic with ticks written 10⁻¹⁸, or plain."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    axis = axes.xaxis if which == "x" else axes.yaxis
    (axes.set_xscale if which == "x" else axes.set_yscale)("log")
    low, high = axes.get_xlim() if which == "x" else axes.get_ylim()
    few_decades = np.log10(high / low) < 2.5
    axis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0) if few_decades else (1.0,), numticks=12))
    axis.set_major_formatter(FuncFormatter(_decade))
    axis.set_minor_formatter(NullFormatter())


def _decade(value: float, _: int) -> str:
    """Plain from 0.01 to 1000, else with powers of ten."""
    if 0.009 < value < 1100.0:
        return f"{value:g}"
    exponent = int(np.floor(np.log10(value) + 1e-9))
    factor = value / 10.0**exponent
    return raised(exponent) if abs(factor - 1.0) < 1e-6 else f"{factor:.0f}·{raised(exponent)}"


def time_axis(axes: Axes) -> None:
    """Let the x axis show UTC; values are days as `days_utc` of the envelope gives them."""
    from matplotlib import dates

    locator = dates.AutoDateLocator(minticks=3, maxticks=8)  # type: ignore[no-untyped-call]
    formatter = dates.ConciseDateFormatter(locator, show_offset=True)  # type: ignore[no-untyped-call]
    axes.xaxis.set_major_locator(locator)
    axes.xaxis.set_major_formatter(formatter)
