"""One session of a campaign: read its record, screen it, correct it epoch by epoch, average it."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.chaining import read_chain
from clockgeo.campaign.schema import Campaign, Session
from clockgeo.campaign.site_tides import site_tide, years_from_epoch
from clockgeo.errors import DataError
from clockgeo.frequency import (
    Record,
    Screening,
    TickSeries,
    exact_number,
    find_transition,
    read_record,
    screen,
)
from clockgeo.levelling.session_rows import SessionMean
from clockgeo.levelling.stations import Clock
from clockgeo.levelling.tide_correction import TideCorrection, tide_correction
from clockgeo.progress import track

__all__ = [
    "Measured",
    "measure",
    "measure_all",
    "measure_record",
    "nominal_frequency_of",
    "nominal_ratio_of",
    "tide_of",
]


@dataclass(frozen=True, eq=False)
class Measured:
    """A session with its data.

    Attributes
    ----------
    session : Session
    record : Record
        As read; nothing is left out.
    screening : Screening
        Which epochs count, with reasons.
    series : TickSeries
        Valid epochs after the tide and the systematic corrections.
    correction : float
        Sum of the systematic corrections that were added, fractional.
    tide : TideCorrection
        What was added for the tide at the valid epochs.
    y_without_screening : float
        Mean over every usable epoch with the same corrections, fractional.
    """

    session: Session
    record: Record
    screening: Screening
    series: TickSeries
    correction: float
    tide: TideCorrection
    y_without_screening: float

    @property
    def y(self) -> float:
        """Mean over the valid epochs, fractional."""
        return float(np.mean(self.series.y))

    @property
    def pair(self) -> tuple[str, str]:
        """The two clocks, in alphabetical order."""
        n, d = (place.clock for place in self.session.places)
        return (n, d) if n < d else (d, n)

    @property
    def direction(self) -> float:
        """+1 if the first clock of `pair` is the numerator, else -1."""
        return 1.0 if self.session.numerator.clock == self.pair[0] else -1.0

    def mean(self, campaign: Campaign) -> SessionMean:
        """Return what the linear model needs of this session."""
        session = self.session
        return SessionMean(
            id=session.id,
            numerator=campaign.clock(session.numerator.clock),
            numerator_site=campaign.site(session.numerator.site),
            denominator=campaign.clock(session.denominator.clock),
            denominator_site=campaign.site(session.denominator.site),
            links=tuple(campaign.link(link) for link in session.links),
            start_ns=self.record.start,
            y=self.y,
            u_tide=self.tide.u,
            years=years_from_epoch(campaign, (self.record.start + self.record.stop) // 2),
        )


def nominal_frequency_of(clock: Clock) -> Fraction:
    """Exact nominal frequency of a clock in Hz.

    Raises
    ------
    DataError
        If the clock states neither a listed transition nor a frequency.
    """
    if clock.nominal_frequency is not None:
        return exact_number(clock.nominal_frequency)
    if clock.transition is None:
        raise DataError(
            "a clock has no nominal frequency",
            where=f"clock {clock.id}",
            advice="Give its transition or nominal_frequency",
        )
    return find_transition(clock.transition).frequency


def nominal_ratio_of(campaign: Campaign, session: Session) -> Fraction:
    """Exact nominal ratio of a session, numerator over denominator."""
    n, d = (campaign.clock(place.clock) for place in session.places)
    return nominal_frequency_of(n) / nominal_frequency_of(d)


def tide_of(
    campaign: Campaign, session: Session, tai_ns: NDArray[np.int64], *, folder: Path
) -> TideCorrection:
    """Correction that removes the time-variable tide from a session's y at the given epochs.

    Parameters
    ----------
    campaign : Campaign
        Says whether the tide is removed at all.
    session : Session
        Says which sites are compared.
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds.
    folder : Path
        Where the names of tables for pole tide and loading start.

    Returns
    -------
    TideCorrection
        To be added to y; zero where both clocks are at one site or the campaign asks for none.
    """
    n, d = (campaign.site(place.site) for place in session.places)
    if campaign.head.tide == "none" or n.id == d.id or tai_ns.size == 0:
        return TideCorrection.none(tai_ns.size)
    at_n, at_d = (site_tide(campaign, site, folder) for site in (n, d))
    return tide_correction(tai_ns, numerator=at_n, denominator=at_d)


def measure(
    campaign: Campaign, session: Session, folder: Path, *, skip_bad_rows: bool = False
) -> Measured:
    """Read, screen and correct the record of one session.

    Parameters
    ----------
    campaign : Campaign
        The document.
    session : Session
        One of its sessions, with a record.
    folder : Path
        Where relative file names start.
    skip_bad_rows : bool
        Whether rows that cannot be read are left out with a note, rather than refused.

    Raises
    ------
    DataError
        If the session has no record, the record cannot be read, or no epoch of it is valid.
    """
    nominal = nominal_ratio_of(campaign, session)
    if session.chain is not None:
        record = read_chain(
            session.chain, session, folder, nominal_ratio=nominal, skip_bad_rows=skip_bad_rows
        )
        return measure_record(campaign, session, record, folder=folder)
    if session.record is None:
        raise DataError(
            "a session has no record yet",
            where=f"session {session.id}",
            advice="Add its record, or leave the session out with --without",
        )
    record = read_record(
        session.record,
        base=folder,
        name=session.id,
        nominal_ratio=nominal,
        carrier=nominal_frequency_of(campaign.clock(session.numerator.clock)),
        skip_bad_rows=skip_bad_rows,
    )
    return measure_record(campaign, session, record, folder=folder)


def measure_all(
    campaign: Campaign, sessions: Sequence[Session], folder: Path, *, skip_bad_rows: bool = False
) -> list[Measured]:
    """Measure sessions in their order, two at a time; otherwise as `measure`.

    Reading and screening spend their time in compiled code, so that a second session is worked on
    while the first one waits.
    """

    def one(session: Session) -> Measured:
        return measure(campaign, session, folder, skip_bad_rows=skip_bad_rows)

    with ThreadPoolExecutor(max_workers=2) as workers:
        done = workers.map(one, sessions)
        return list(track(done, "reading records", len(sessions)))


def measure_record(
    campaign: Campaign, session: Session, record: Record, *, folder: Path
) -> Measured:
    """Screen and correct a record that is already in memory; otherwise as `measure`."""
    n = campaign.clock(session.numerator.clock)
    rules = session.screening or campaign.head.screening
    screening = screen(record, rules, carrier_hz=float(nominal_frequency_of(n)))
    if not screening.valid.any():
        raise DataError(
            "no epoch of the record is valid",
            value=", ".join(f"{reason}: {count}" for reason, count in screening.counts.items()),
            where=f"session {session.id}",
            advice="Look at it with clockgeo screen, and at the screening rules",
        )
    valid = screening.valid
    usable_tide = tide_of(campaign, session, record.tai_ns[record.usable], folder=folder)
    correction = _systematic_correction(campaign, session)
    corrected = record.y[record.usable] + usable_tide.at_epochs + correction
    counted = valid[record.usable]
    return Measured(
        session=session,
        record=record,
        screening=screening,
        series=TickSeries(record.tick[valid], corrected[counted]),
        correction=correction,
        tide=usable_tide.at(counted),
        y_without_screening=float(np.mean(corrected)),
    )


def _systematic_correction(campaign: Campaign, session: Session) -> float:
    """What the budgets of clocks, links and the nominal ratio say must be added to y."""
    n, d = (campaign.clock(place.clock) for place in session.places)
    total = n.correction - d.correction
    total += sum(campaign.link(link).correction for link in session.links)
    for ratio in campaign.nominal_ratios:
        if (ratio.numerator, ratio.denominator) == (n.species, d.species):
            total += ratio.correction
        elif (ratio.numerator, ratio.denominator) == (d.species, n.species):
            total -= ratio.correction
    return total
