"""A record with its flagged epochs."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.report.envelope import days_utc, envelope, stretches
from clockgeo.report.numbers import raised, rounded, typeset, with_uncertainty
from clockgeo.report.style import (
    LIGHT,
    MARKERS,
    SERIES,
    blank,
    label_axes,
    picture,
    power_of_ten,
    time_axis,
)
from clockgeo.times import SECOND_NS

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["record_picture"]

_COLUMNS = 1_000
_FEW = 1_500
"""Up to so many epochs are drawn as single points."""
_NOT_USABLE, _MASKED = 1, 16
_REASON_NAMES = {2: "out of bounds", 4: "outlier", 8: "cycle slip"}


@picture
def record_picture(
    tai_ns: NDArray[np.int64],
    y: NDArray[np.float64],
    reasons: NDArray[np.uint8],
    *,
    interval: float,
    u_mean: float | None = None,
    title: str = "",
) -> Figure:
    """Draw y against UTC: what counts as a band, what was flagged as markers, and the uptime.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds, increasing.
    y : float array, shape (N,)
        Fractional frequency; NaN where there is none.
    reasons : uint8 array, shape (N,)
        Flags of `frequency.Reason`, 0 where the row counts.
    interval : float
        Sampling interval in s.
    u_mean : float, optional
        Standard uncertainty of the mean, drawn as a band around it.
    title : str

    Returns
    -------
    Figure
        Up to 1500 epochs as points, more as lowest and highest value of 1000 columns of time.
    """
    counts = reasons == 0
    start, stop = int(tai_ns[0]), int(tai_ns[-1]) + round(interval * SECOND_NS)
    middle = float(np.mean(y[counts])) if counts.any() else 0.0
    spread = _robust_spread(y[counts] - middle) if counts.any() else 1e-15
    limit = _limit(y[counts] - middle, spread)
    exponent = power_of_ten([limit])
    unit = 10.0**exponent
    limit /= unit
    figure, axes = blank(7.0, 2.6)
    _draw_valid(axes, tai_ns[counts], (y[counts] - middle) / unit, start, stop)
    _draw_mean(axes, middle, u_mean, unit)
    _draw_masked(axes, tai_ns[reasons & _MASKED != 0], interval, (stop - start) / SECOND_NS)
    for place, (flag, name) in enumerate(_REASON_NAMES.items()):
        flagged = (reasons & flag != 0) & np.isfinite(y) & (reasons & _NOT_USABLE == 0)
        if flagged.any():
            values = (y[flagged] - middle) / unit
            _draw_flagged(axes, tai_ns[flagged], values, limit, place, name)
    axes.set_ylim(-1.32 * limit, 1.12 * limit)
    axes.set_xlim(*days_utc(np.array([start, stop])).tolist())
    _draw_uptime(axes, tai_ns[counts], interval, (stop - start) / SECOND_NS)
    time_axis(axes)
    label_axes(axes, "time (UTC)", f"y − mean / {raised(exponent)}", title)
    figure.legend(loc="outside lower left", ncols=4)
    return figure


def _robust_spread(values: NDArray[np.float64]) -> float:
    """Half the width that holds the middle 68 %; the scale of the picture only."""
    step = max(1, values.size // 20_000)
    low, high = np.percentile(values[::step], [16.0, 84.0])
    return max(float(high - low) / 2.0, 1e-30)


def _limit(values: NDArray[np.float64], spread: float) -> float:
    """Top of the picture: all that counts, unless a few values would flatten the rest."""
    largest = float(np.max(np.abs(values))) if values.size else spread
    return 1.1 * min(max(largest, 3.0 * spread), 12.0 * spread)


def _draw_valid(
    axes: Axes, tai_ns: NDArray[np.int64], y: NDArray[np.float64], start: int, stop: int
) -> None:
    if tai_ns.size <= _FEW:
        axes.plot(days_utc(tai_ns), y, ".", color=LIGHT["slate"], markersize=2.2, label="counts")
        return
    drawn = envelope(tai_ns, y, start, stop, _COLUMNS)
    width = (stop - start) / SECOND_NS / 86_400.0 / _COLUMNS
    left = days_utc(np.array([start]))[0] + drawn.column * width
    # Where a column is empty the band must break: an empty line goes between.
    holes = np.flatnonzero(np.diff(drawn.column) > 1) + 1
    edges = np.insert(np.stack([left, left + width], axis=1), holes, np.nan, axis=0).ravel()
    low = np.insert(np.repeat(drawn.low[:, None], 2, axis=1), holes, np.nan, axis=0).ravel()
    high = np.insert(np.repeat(drawn.high[:, None], 2, axis=1), holes, np.nan, axis=0).ravel()
    axes.fill_between(
        edges, low, high, color=LIGHT["slate"], linewidth=0.3, label="counts: lowest to highest"
    )


def _draw_mean(axes: Axes, middle: float, u_mean: float | None, unit: float) -> None:
    colour = LIGHT["lake"]
    written = typeset(with_uncertainty(middle, u_mean) if u_mean else rounded(middle, 6))
    if u_mean is not None:
        axes.axhspan(-u_mean / unit, u_mean / unit, color=colour, alpha=0.45, linewidth=0.0)
    axes.axhline(0.0, color=colour, linewidth=1.2, label=f"mean as read {written}")


def _draw_flagged(
    axes: Axes,
    tai_ns: NDArray[np.int64],
    y: NDArray[np.float64],
    limit: float,
    place: int,
    name: str,
) -> None:
    """Hollow markers; those beyond the picture sit on its edge."""
    drawn = envelope(tai_ns, y, int(tai_ns[0]), int(tai_ns[-1]) + 1, _COLUMNS)
    days = np.repeat(days_utc(drawn.tai_ns), 2)
    values = np.clip(np.stack([drawn.low, drawn.high], axis=1).ravel(), -limit, limit)
    axes.plot(
        days,
        values,
        MARKERS[1 + place % (len(MARKERS) - 1)],
        markerfacecolor="none",
        markeredgecolor=LIGHT[("clay", "heather", "ink")[place]],
        markersize=4.5,
        label=f"{name} ({y.size})",
    )


def _draw_masked(axes: Axes, tai_ns: NDArray[np.int64], interval: float, span: float) -> None:
    """Hatched where somebody left data out by hand."""
    label = f"masked ({tai_ns.size})"
    for bar in stretches(tai_ns, interval, bridging=span / _COLUMNS):
        first, last = days_utc(np.array(bar)).tolist()
        axes.axvspan(
            first,
            last,
            facecolor="none",
            edgecolor=LIGHT["quiet"],
            hatch="////",
            linewidth=0.5,
            hatchcolor=LIGHT["quiet"],
            label=label,
        )
        label = ""


def _draw_uptime(axes: Axes, tai_ns: NDArray[np.int64], interval: float, span: float) -> None:
    """A bar along the bottom where there is valid data."""
    bottom = axes.get_ylim()[0]
    height = (axes.get_ylim()[1] - bottom) * 0.035
    bars = stretches(tai_ns, interval, bridging=span / _COLUMNS)
    ends = days_utc(np.array(bars, dtype=np.int64).reshape(-1, 2).ravel()).reshape(-1, 2)
    axes.broken_barh(
        [(first, last - first) for first, last in ends.tolist()],
        (bottom, height),
        facecolor=LIGHT[SERIES[4]],
        edgecolor="none",
        label="valid time",
    )
