"""Simulated campaigns: what the records would hold if the stated truth were true.

The same model as in levelling, read from right to left: the truth's potentials, one draw of every
effect, continuous clock and link noise over the whole campaign, the tide, then gaps, outliers and
rounded stamps as in real records.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.measuring import nominal_ratio_of, tide_of
from clockgeo.campaign.schema import Campaign, Session, Truth
from clockgeo.campaign.site_tides import years_from_epoch
from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, Record, draw_noise, write_record
from clockgeo.levelling.redshift import shift_from_potential
from clockgeo.levelling.session_rows import (
    SessionMean,
    ratio_of,
    stays_of,
    systematic_loads,
    transfer_difference,
)
from clockgeo.levelling.stations import Clock, Link
from clockgeo.planning.chain_simulation import write_chain, write_missing_headers
from clockgeo.progress import track
from clockgeo.times import SECOND_NS, tai_from_iso

__all__ = ["SimulatedSession", "simulate_records", "simulate_sessions"]


@dataclass(frozen=True, eq=False)
class SimulatedSession:
    """One drawn record.

    Attributes
    ----------
    session : Session
        The session of the document.
    tai_ns : int64 array, shape (N,)
        Starts of the averaging intervals; rows that are missing are left out.
    y : float array, shape (N,)
        Fractional frequency before any correction; NaN marks a row without valid data.
    interval : float
        Sampling interval in s.
    """

    session: Session
    tai_ns: NDArray[np.int64]
    y: NDArray[np.float64]
    interval: float

    def record(self) -> Record:
        """Return the draw as it would be read back, without a file in between."""
        usable = np.isfinite(self.y)
        return Record(
            name=self.session.id,
            tai_ns=self.tai_ns,
            y=self.y,
            usable=usable,
            interval=self.interval,
            tick=np.rint(self.tai_ns / (self.interval * SECOND_NS)).astype(np.int64),
        )


def simulate_records(
    campaign: Campaign, *, seed: int, folder: Path, tables: Path, replace: bool = False
) -> list[Path]:
    """Draw and write the record, or the chain of comparators, of every session that names one.

    Parameters
    ----------
    campaign : Campaign
        A document with `[truth]`; sessions need a start and a length.
    seed : int
        Seed of the generator; equal input and seed give equal bytes.
    folder : path
        Folder that the records' file names start from.
    tables : path
        Folder that the names of tables for the tide start from: the document's.
    replace : bool
        Whether existing records may be replaced.

    Returns
    -------
    list of Path
        The files written.

    Raises
    ------
    DataError
        If the document has no truth, or a session no start, no length, or several files.
    """
    truth = _truth(campaign)
    written = write_missing_headers(campaign, tables=tables, folder=folder)
    sessions = simulate_sessions(campaign, np.random.default_rng(seed), tables=tables)
    for number, drawn in enumerate(sessions):
        if drawn.session.chain is not None:
            written += write_chain(
                drawn.session.chain,
                drawn.record(),
                nominal_ratio=nominal_ratio_of(campaign, drawn.session),
                tables=tables,
                folder=folder,
                rng=np.random.default_rng([seed, number]),
                replace=replace,
            )
            continue
        layout = drawn.session.record
        if layout is None:
            continue
        if not isinstance(layout.file, str):
            raise DataError(
                "a simulated session writes one file",
                value=layout.file,
                where=f"session {drawn.session.id}",
                advice="Name one file in its record",
            )
        path = folder / layout.file
        path.parent.mkdir(parents=True, exist_ok=True)
        write_record(
            path,
            drawn.tai_ns,
            drawn.y,
            layout=layout,
            nominal_ratio=nominal_ratio_of(campaign, drawn.session),
            stamp_decimals=truth.stamp_decimals,
            replace=replace,
        )
        written.append(path)
    return written


def simulate_sessions(
    campaign: Campaign, generator: np.random.Generator, *, tables: Path
) -> Iterator[SimulatedSession]:
    """Yield one drawn record per session, in the document's order.

    Parameters
    ----------
    campaign : Campaign
        A document with `[truth]`.
    generator : numpy.random.Generator
        Source of all chance; each clock, link, effect and session has its own stream, so that
        adding a session leaves the others as they were.
    tables : path
        Folder that the names of tables for the tide start from: the document's.
    """
    truth = _truth(campaign)
    timeline = _Timeline.of(campaign, truth)
    noise_seed, effect_seed, session_seed = generator.bit_generator.seed_seq.spawn(3)  # type: ignore[attr-defined]
    noise = _drawn_noise(campaign, truth, timeline, noise_seed)
    means = [_true_mean(campaign, session) for session in campaign.sessions]
    stays = stays_of(means)
    effects: dict[object, float] = {}
    effect_stream = np.random.default_rng(effect_seed)
    streams = [np.random.default_rng(s) for s in session_seed.spawn(len(means))]
    steps = zip(campaign.sessions, means, streams, strict=True)
    for session, mean, stream in track(steps, "drawing records", len(means)):
        offset = _true_shift(campaign, truth, mean) - _corrections(mean)
        for key, load in systematic_loads(mean, stays).items():
            if key not in effects:
                effects[key] = float(effect_stream.normal())
            offset += shift_from_potential(load) * effects[key]
        offset += truth.session_scatter * float(stream.normal())
        first, count = timeline.place(session)
        y = offset + _session_noise(session, noise, slice(first, first + count))
        stamps = mean.start_ns + np.arange(count) * timeline.step_ns
        y -= tide_of(campaign, session, stamps, folder=tables).at_epochs
        yield _with_gaps(session, truth, stamps, y, stream)


@dataclass(frozen=True)
class _Timeline:
    """The common grid of samples on which all noise is drawn."""

    origin_ns: int
    count: int
    step_ns: int

    @classmethod
    def of(cls, campaign: Campaign, truth: Truth) -> _Timeline:
        step = round(truth.interval * SECOND_NS)
        windows = [_window(session) for session in campaign.sessions]
        origin = min(start for start, _ in windows)
        return cls(origin, (max(stop for _, stop in windows) - origin) // step + 2, step)

    def place(self, session: Session) -> tuple[int, int]:
        """First sample and number of samples of a session."""
        start, stop = _window(session)
        return (start - self.origin_ns) // self.step_ns, (stop - start) // self.step_ns


def _window(session: Session) -> tuple[int, int]:
    """Start and stop in TAI nanoseconds."""
    if session.start is None or session.planned_seconds is None:
        raise DataError(
            "a session cannot be simulated without start and length",
            where=f"session {session.id}",
            advice="Give start and stop, or start and hours",
        )
    start = tai_from_iso(session.start.isoformat())
    return start, start + round(session.planned_seconds * SECOND_NS)


def _truth(campaign: Campaign) -> Truth:
    if campaign.truth is None:
        raise DataError(
            "the campaign has no [truth] to draw from",
            value=campaign.head.name,
            advice="Add a [truth] table with geopotential_numbers",
        )
    return campaign.truth


def _drawn_noise(
    campaign: Campaign, truth: Truth, timeline: _Timeline, seed: np.random.SeedSequence
) -> dict[str, NDArray[np.float64]]:
    """Noise of every clock and link over the whole campaign."""
    devices: tuple[Clock | Link, ...] = (*campaign.clocks, *campaign.links)
    stated = {item.id: item.instability for item in devices}
    models: dict[str, NoiseModel] = stated | truth.instability
    streams = [np.random.default_rng(s) for s in seed.spawn(len(models))]
    return {
        name: draw_noise(model, timeline.count, truth.interval, stream)
        for (name, model), stream in zip(models.items(), streams, strict=True)
    }


def _session_noise(
    session: Session, noise: dict[str, NDArray[np.float64]], part: slice
) -> NDArray[np.float64]:
    total = noise[session.numerator.clock][part] - noise[session.denominator.clock][part]
    for link in session.links:
        total = total + noise[link][part]
    return total


def _true_mean(campaign: Campaign, session: Session) -> SessionMean:
    return SessionMean(
        id=session.id,
        numerator=campaign.clock(session.numerator.clock),
        numerator_site=campaign.site(session.numerator.site),
        denominator=campaign.clock(session.denominator.clock),
        denominator_site=campaign.site(session.denominator.site),
        links=tuple(campaign.link(link) for link in session.links),
        start_ns=_window(session)[0],
        y=0.0,
        years=years_from_epoch(campaign, sum(_window(session)) // 2),
    )


def _true_shift(campaign: Campaign, truth: Truth, mean: SessionMean) -> float:
    """Fractional frequency that the true potentials and nominal ratio give."""
    numbers = truth.geopotential_numbers
    difference = numbers[mean.numerator_site.id] - numbers[mean.denominator_site.id]
    shift = shift_from_potential(difference + transfer_difference(mean, campaign.head.tide_system))
    if ratio_of(mean.numerator, mean.denominator) is not None:
        n, d = mean.numerator.species, mean.denominator.species
        errors = truth.nominal_ratio_errors
        shift += errors.get(f"{n}/{d}", -errors.get(f"{d}/{n}", 0.0))
    return shift


def _corrections(mean: SessionMean) -> float:
    """What levelling will add later, so what the raw record lacks now."""
    links = sum(link.correction for link in mean.links)
    return mean.numerator.correction - mean.denominator.correction + links


def _with_gaps(
    session: Session,
    truth: Truth,
    stamps: NDArray[np.int64],
    y: NDArray[np.float64],
    stream: np.random.Generator,
) -> SimulatedSession:
    """Cut gaps (half as missing rows, half as NaN rows) and add outliers."""
    state = _runs(len(y), session.uptime, truth, stream)
    spread = float(np.std(np.diff(y))) / np.sqrt(2.0) if len(y) > 2 else 0.0
    days = len(y) * truth.interval / 86_400.0
    hits = stream.integers(0, len(y), size=stream.poisson(truth.outliers_per_day * days))
    y = y.copy()
    y[hits] += truth.outlier_size * spread * stream.choice([-1.0, 1.0], size=hits.size)
    y[state == 1] = np.nan
    present = state != 2
    return SimulatedSession(session, stamps[present], y[present], truth.interval)


def _runs(
    count: int, uptime: float, truth: Truth, stream: np.random.Generator
) -> NDArray[np.int64]:
    """State of each sample: 0 valid, 1 row without data, 2 no row. Exponential run lengths."""
    state = np.zeros(count, dtype=np.int64)
    if uptime >= 1.0:
        return state
    if uptime <= 0.0:
        return np.ones(count, dtype=np.int64)
    mean_run = truth.mean_run / truth.interval
    mean_gap = mean_run * (1.0 - uptime) / uptime
    place, valid = 0, bool(stream.random() < uptime)
    while place < count:
        length = 1 + int(stream.exponential(mean_run if valid else mean_gap))
        if not valid:
            state[place : place + length] = stream.integers(1, 3)
        place, valid = place + length, not valid
    return state
