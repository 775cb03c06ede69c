"""The time line of a record: sampling interval and integer ticks from jittered stamps.

Stamps are printed coarsely (1e-6 d is 0.0864 s), rows are missing, the clock that stamps them
wanders against the counter's, and a restarted counter is off the old grid. Ticks therefore follow
the stamps locally: neighbours one interval apart always get neighbouring ticks, whatever the
interval's last digit, and after a long gap the count starts anew from the common origin.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.frequency.parts import in_parts
from clockgeo.times import SECOND_NS

__all__ = ["Sampling", "estimate_interval", "sample_ticks"]

_LAG = 50
_COARSE = 0.25
"""Stamps whose quantum is larger than this part of the interval are tracked over many rows."""
_TRACKED_ROWS = 257
_ANEW_AFTER = 60
"""Missing ticks after which the count starts anew from the common origin."""
_ENOUGH_ROWS = 20_000
"""Rows that settle a median or a first guess."""
_LARGEST_DRIFT = 0.1
"""Largest drift, in intervals over the record, for which an interval is given fewer digits; the
jitter of the stamps at the ends of its stretches comes on top."""
_LARGEST_WANDER = 0.01
"""Largest part of its length that a record may wander against the estimated interval."""
_DECIMAL_DAYS_NS = (86_400_000, 864_000_000)
"""Roundings of an MJD (1e-6 d, 1e-5 d) that are coarse against a second."""
_STATE_THE_INTERVAL = "State the interval in the record's layout"


@dataclass(frozen=True, eq=False)
class Sampling:
    """How stamps lie on a time line.

    Attributes
    ----------
    interval : float
        Sampling interval, s.
    tick : int64 array, shape (N,)
        Position of each stamp, counted from the origin of TAI in whole intervals.
    jitter : float
        Standard deviation of a stamp about the local grid, s.
    wander : float
        Largest distance, s, that stamps move against one rigid grid without a gap to explain it.
    restarts : int
        Steps that are off the grid by more than a quarter of an interval.
    step : float
        Mean time from tick to tick by the stamps, s; long gaps left out.
    """

    interval: float
    tick: NDArray[np.int64]
    jitter: float
    wander: float
    restarts: int
    step: float


def estimate_interval(tai_ns: NDArray[np.int64]) -> float:
    """Estimate the sampling interval of increasing stamps, in s.

    A first guess comes from stretches of complete rows, or from the shortest kind of step where
    rows are missing everywhere; then the time between rows is divided by the number of intervals
    it holds, so that the rounding of stamps cannot bias it (a median step can be off by the
    rounding: 1.037 s for 1.0568 s). The result is given with the fewest digits that keep every
    stamp within a tenth of an interval and its jitter.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Strictly increasing stamps, ns.

    Returns
    -------
    float
        The interval, s.

    Raises
    ------
    DataError
        If there are fewer than two stamps, or coarse stamps with many rows missing.
    """
    width = _rough_width(tai_ns)
    return _interval(tai_ns, _whole_steps(tai_ns, width)[0], width)


def _rough_width(tai_ns: NDArray[np.int64]) -> float:
    """Interval in ns from the first rows, good enough to count the intervals of every step."""
    if tai_ns.size < 2:
        raise DataError(
            "one row is not enough to tell the sampling interval", advice=_STATE_THE_INTERVAL
        )
    some = tai_ns[:_ENOUGH_ROWS]
    width = _first_guess(tai_ns[: 4 * _ENOUGH_ROWS])
    for _ in range(2):
        width, _ = _mean_width(some, _whole_steps(some, width)[0], width)
    return width


def _mean_width(
    tai_ns: NDArray[np.int64], whole: NDArray[np.int64], width: float
) -> tuple[float, int]:
    """Time between rows over the intervals it holds, ns, long gaps left out; that number too."""
    long = np.flatnonzero(whole > _ANEW_AFTER)
    intervals = int(np.sum(whole) - np.sum(whole[long]))
    passed = int(tai_ns[-1] - tai_ns[0] - np.sum(tai_ns[long + 1] - tai_ns[long]))
    return (passed / intervals if intervals else width), max(intervals, 1)


def _interval(tai_ns: NDArray[np.int64], whole: NDArray[np.int64], width: float) -> float:
    """Interval in s, with the fewest digits that length and jitter of the record allow."""
    mean, intervals = _mean_width(tai_ns, whole, width)
    jitter = _jitter(tai_ns, whole, mean)
    long = np.flatnonzero(whole > _ANEW_AFTER)
    # Each stretch between long gaps has two ends with the jitter of a stamp; two deviations of it.
    doubt = 2.0 * jitter * float(np.sqrt(long.size + 1))
    if long.size:
        gaps = (tai_ns[long + 1] - tai_ns[long]) / mean
        ticks = np.rint(gaps)
        allowed = 6.0 * jitter / mean + 2.0 * gaps * doubt / (intervals * mean)
        if np.all(np.abs(gaps - ticks) < np.minimum(allowed, _COARSE)):
            # No gap leaves the grid: the whole length then tells of the interval.
            intervals += int(np.sum(ticks))
            mean, doubt = float(tai_ns[-1] - tai_ns[0]) / intervals, 2.0 * jitter
    return _plainest(mean, (_LARGEST_DRIFT * mean + doubt) / intervals) / SECOND_NS


def _first_guess(tai_ns: NDArray[np.int64]) -> float:
    """Interval in ns, good to a part in a hundred or so."""
    lag = min(_LAG, max(1, (tai_ns.size - 1) // 4))
    strides = tai_ns[lag:] - tai_ns[:-lag]
    steps = np.diff(tai_ns)
    middle, short = float(np.median(strides)), float(np.percentile(steps, 20))
    # Complete stretches differ by the rounding of their two ends only.
    complete = np.abs(strides - middle) < 0.5 * short
    if np.mean(complete) > 0.6:
        return float(np.mean(strides[complete])) / lag
    for quantum in _DECIMAL_DAYS_NS:
        if short < 4 * quantum and not np.any(steps % quantum):
            raise DataError(
                "the stamps are too coarse, and too many rows missing, to tell the interval",
                value=f"steps of {quantum / SECOND_NS:g} s, the rounding of the MJD",
                advice=_STATE_THE_INTERVAL,
            )
    return float(np.mean(steps[steps < 1.5 * short]))


def _plainest(value: float, tolerance: float) -> float:
    """The number with the fewest significant digits within `tolerance` of `value`."""
    for digits in range(1, 17):
        candidate = float(f"{value:.{digits}g}")
        if abs(candidate - value) <= tolerance:
            return candidate
    return value


def sample_ticks(tai_ns: NDArray[np.int64], *, interval: float | None = None) -> Sampling:
    """Give every stamp its integer place on the time line.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Strictly increasing stamps, ns of TAI.
    interval : float, optional
        Sampling interval, s; estimated where not given.

    Returns
    -------
    Sampling
        Interval, ticks, and how well the stamps fit.

    Raises
    ------
    DataError
        If the rows come much faster than the interval or have none in common, or one row comes
        without an interval.

    Notes
    -----
    With x = t/interval, the phase ψ of the stamps on the line is followed row by row (fine stamps)
    or as the mean direction of exp(2πix) over 257 rows (stamps coarser than a quarter of the
    interval), unwrapped, and the tick is the integer nearest to x − ψ. Stamps may be off by up to
    0.4 intervals; an interval wrong by 1 part in 1000 costs no tick.
    """
    width = _rough_width(tai_ns) if interval is None else float(interval) * SECOND_NS
    _refuse_dense(tai_ns, width)
    whole, off_grid = _whole_steps(tai_ns, width)
    chosen = _interval(tai_ns, whole, width) if interval is None else float(interval)
    tick = _counted_from_origin(tai_ns, np.maximum(whole, 1, out=whole), chosen * SECOND_NS)
    some = slice(None, None, tick.size // _ENOUGH_ROWS + 1)
    wander = float(np.ptp(tai_ns[some] / SECOND_NS - tick[some] * chosen))
    if interval is None:
        _refuse_gridless(wander, tai_ns, chosen)
    return Sampling(
        interval=chosen,
        tick=tick,
        jitter=_jitter(tai_ns, whole, chosen * SECOND_NS) / SECOND_NS,
        wander=wander,
        restarts=max(off_grid, 0),
        step=_mean_width(tai_ns, whole, chosen * SECOND_NS)[0] / SECOND_NS,
    )


def _refuse_dense(tai_ns: NDArray[np.int64], width: float) -> None:
    """Refuse rows that come much faster than the interval says."""
    tai_ns = tai_ns[: 4 * _ENOUGH_ROWS]
    lag = min(_LAG, tai_ns.size - 1)
    typical = float(np.median(tai_ns[lag:] - tai_ns[:-lag])) / lag if lag else width
    if typical < 0.75 * width:
        raise DataError(
            "the rows come faster than the sampling interval allows",
            value=f"typical step {typical / SECOND_NS:g} s, interval {width / SECOND_NS:g} s",
            advice="State the true sampling interval, or leave it out to have it estimated",
        )


def _refuse_gridless(wander: float, tai_ns: NDArray[np.int64], interval: float) -> None:
    """Refuse an estimated interval that does not describe the stamps."""
    span = float(tai_ns[-1] - tai_ns[0]) / SECOND_NS
    if wander > max(_LARGEST_WANDER * span, 3.0 * interval):
        raise DataError(
            "the stamps have no common sampling interval",
            value=f"they wander by {wander:.3g} s in {span:.3g} s against steps of {interval:g} s",
            advice=_STATE_THE_INTERVAL,
        )


def _whole_steps(tai_ns: NDArray[np.int64], width: float) -> tuple[NDArray[np.int64], int]:
    """Whole intervals between rows, and how many steps are off the grid (-1: coarse stamps)."""
    count = tai_ns.size - 1
    whole = np.empty(count, dtype=np.int64)
    off_grid = 0
    for part in in_parts(count):
        steps = np.diff(tai_ns[part.start : part.stop + 1]) / width
        nearest = np.rint(steps)
        off_grid += int(np.count_nonzero(np.abs(steps - nearest) > _COARSE))
        whole[part] = nearest
    if off_grid <= 0.01 * count:
        return whole, off_grid
    position = tai_ns / width
    return np.diff(np.rint(position - _followed_phase(position))).astype(np.int64), -1


def _followed_phase(position: NDArray[np.float64]) -> NDArray[np.float64]:
    """Slow phase of stamps against the line, in intervals, from the mean direction of many rows."""
    from scipy.ndimage import uniform_filter1d

    angle = 2.0 * np.pi * (position - np.floor(position))
    size = min(_TRACKED_ROWS, position.size)
    cosine, sine = (uniform_filter1d(part, size) for part in (np.cos(angle), np.sin(angle)))
    return np.asarray(np.unwrap(np.arctan2(sine, cosine)) / (2.0 * np.pi))


def _counted_from_origin(
    tai_ns: NDArray[np.int64], whole: NDArray[np.int64], width: float
) -> NDArray[np.int64]:
    """Sum the steps from the rounded position of the first row, anew after each long gap.

    The first row's distance from the line is kept, so that a position halfway between two ticks
    is not rounded now down, now up.
    """
    tick = np.zeros(tai_ns.size, dtype=np.int64)
    np.cumsum(whole, out=tick[1:])
    anew = np.append(0, np.flatnonzero(whole > _ANEW_AFTER) + 1)
    position = tai_ns[anew] / width
    distance = position[0] - np.rint(position[0])
    shift = np.rint(position - distance).astype(np.int64) - tick[anew]
    if anew.size == 1:
        tick += shift
    else:
        tick += np.repeat(shift, np.diff(np.append(anew, tick.size)))
    return tick


def _jitter(tai_ns: NDArray[np.int64], whole: NDArray[np.int64], width: float) -> float:
    """Robust standard deviation of one stamp, ns: a step holds the jitter of two."""
    if not whole.size:
        return 0.0
    some = np.arange(0, whole.size, whole.size // _ENOUGH_ROWS + 1)
    off = np.abs(tai_ns[some + 1] - tai_ns[some] - whole[some] * width)
    return float(1.4826 * np.median(off) / np.sqrt(2.0))
