"""The tide at a place, or of one place minus another, over time."""

from __future__ import annotations

from functools import partial
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.report.envelope import days_utc, envelope
from clockgeo.report.numbers import raised
from clockgeo.report.style import (
    DASHES,
    LIGHT,
    blank,
    label_axes,
    picture,
    power_of_ten,
    time_axis,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["tide_picture"]

_COLUMNS = 1_600


@picture
def tide_picture(
    tai_ns: NDArray[np.int64],
    potential: NDArray[np.float64],
    *,
    u: float | None = None,
    per_potential: float | None = None,
    title: str = "",
) -> Figure:
    """Draw the time-variable tidal potential in UTC, with its standard uncertainty as a band.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds.
    potential : float array, shape (N,)
        m² s⁻².
    u : float, optional
        Standard uncertainty of the potential, m² s⁻².
    per_potential : float, optional
        Fractional frequency for each m² s⁻²; adds a scale of it on the right.
    title : str
    """
    figure, axes = blank(7.0, 2.8)
    shown = tai_ns, potential
    if tai_ns.size > 2 * _COLUMNS:
        drawn = envelope(tai_ns, potential, int(tai_ns[0]), int(tai_ns[-1]) + 1, _COLUMNS)
        shown = drawn.tai_ns, (drawn.low + drawn.high) / 2.0
    days, values = days_utc(shown[0]), shown[1]
    axes.axhline(0.0, color=LIGHT["quiet"], linewidth=0.8)
    if u is not None:
        axes.fill_between(
            days, values - u, values + u, color=LIGHT["lake"], alpha=0.4, linewidth=0.0, label="± u"
        )
    axes.plot(days, values, color=LIGHT["slate"], linestyle=DASHES[0], label="tidal potential")
    axes.margins(x=0.0)
    time_axis(axes)
    label_axes(axes, "time (UTC)", "tidal potential / m² s⁻²", title)
    if per_potential is not None:
        _frequency_scale(axes, per_potential, potential)
    figure.legend(loc="outside lower left", ncols=2)
    return figure


def _frequency_scale(axes: Axes, per_potential: float, potential: NDArray[np.float64]) -> None:
    """A second scale on the right."""
    exponent = power_of_ten(per_potential * potential)
    factor = per_potential / 10.0**exponent
    scale = axes.secondary_yaxis(
        "right", functions=(partial(np.multiply, factor), partial(np.multiply, 1.0 / factor))
    )
    scale.set_ylabel(f"fractional frequency / {raised(exponent)}")
