"""Simulated comparators: a drawn ratio, spread over the chain that is to measure it."""

from __future__ import annotations

import itertools
from fractions import Fraction
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.measuring import nominal_frequency_of
from clockgeo.campaign.schema import Campaign, ChainSource
from clockgeo.errors import DataError
from clockgeo.files import write_text
from clockgeo.frequency import NoiseModel, Record, draw_noise
from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.comparator import exact_decimal
from clockgeo.frequency.exchange import HEADERS, read_exchange
from clockgeo.frequency.exchange_writing import output_text

__all__ = ["write_chain", "write_missing_headers"]

_HEADER = "comparators.yml"

_FLYWHEEL = NoiseModel(white_fm=1e-14, flicker_fm=2e-15)
"""Noise of lasers and masers between the clocks; it drops out of the chain."""


def write_missing_headers(campaign: Campaign, *, tables: Path, folder: Path) -> list[Path]:
    """Write a header for every exchange folder of the document that has none yet.

    Parameters
    ----------
    campaign : Campaign
        Its sessions name the folders and the oscillators of their two clocks.
    tables : Path
        Folder that existing headers are found from.
    folder : Path
        Folder to write from.

    Returns
    -------
    list of Path
        One header a folder, with one comparator from clock to clock for each pair of oscillators.
    """
    missing: dict[Path, dict[str, str]] = {}
    for session in campaign.sessions:
        source = session.chain
        if source is not None and not any((tables / source.folder).glob(HEADERS)):
            n, d = (
                exact_decimal(nominal_frequency_of(campaign.clock(place.clock)))
                for place in session.places
            )
            name = f"{source.numerator}-{source.denominator}"
            interval = campaign.truth.interval if campaign.truth else 1.0
            entries = missing.setdefault(folder / source.folder / _HEADER, {})
            entries[name] = (
                f"- name: {name}\n  numrhoBA: {n}\n  denrhoBA: {d}\n  sB: {n}\n"
                f"  nu0A: {d}\n  nu0B: {n}\n  interval: {interval:g}\n  lag: 1\n"
            )
    for path, entries in missing.items():
        path.parent.mkdir(parents=True, exist_ok=True)
        write_text(path, "".join(entries.values()))
    return list(missing)


def write_chain(
    source: ChainSource,
    record: Record,
    *,
    nominal_ratio: Fraction,
    tables: Path,
    folder: Path,
    rng: np.random.Generator,
    replace: bool,
) -> list[Path]:
    """Write the outputs of every comparator of a chain for one drawn session.

    Parameters
    ----------
    source : ChainSource
        Names the exchange folder and the two oscillators.
    record : Record
        Drawn fractional ratio of the two clocks; its unusable rows get flag 0 everywhere.
    nominal_ratio : Fraction
        That the drawn ratio refers to.
    tables : Path
        Folder that the exchange folder's headers are found from, or else `folder`.
    folder : Path
        Folder to write from.
    rng : numpy.random.Generator
        Draws the oscillators in between.
    replace : bool
        Whether existing files may be replaced.

    Returns
    -------
    list of Path
        One data file a comparator, and headers where they are not there yet.
    """
    here = any((tables / source.folder).glob(HEADERS))
    exchange = read_exchange((tables if here else folder) / source.folder)
    chain = find_chains(
        exchange.comparators, denominator=source.denominator, numerator=source.numerator
    )[0]
    target = folder / source.folder
    written = []
    for name, text in exchange.headers:
        path = target / name
        if not path.exists():
            path.parent.mkdir(parents=True, exist_ok=True)
            write_text(path, text)
            written.append(path)
    step = float(chain.nominal_ratio / nominal_ratio - 1)
    parts = _parts(record.y - step, len(chain.links), record.interval, rng)
    for link, factor, reduced in zip(chain.links, chain.coefficients, parts, strict=True):
        one = link.comparator
        if one.interval is not None and abs(one.interval - record.interval) > 1e-9:
            raise DataError(
                "the truth's interval is not that of the comparator",
                value=f"{record.interval:g} s, {one.interval:g} s",
                where=one.name,
            )
        output = Record(
            name=one.name,
            tai_ns=record.tai_ns,
            y=reduced / float(factor),
            usable=record.usable,
            interval=record.interval,
            tick=record.tick,
        )
        path = target / one.name / f"{_slug(record)}.dat"
        path.parent.mkdir(parents=True, exist_ok=True)
        write_text(path, output_text(one, output), replace=replace)
        written.append(path)
    return written


def _parts(
    total: NDArray[np.float64], number: int, interval: float, rng: np.random.Generator
) -> list[NDArray[np.float64]]:
    """Reduced ratios that add up to the total, with oscillators of their own in between."""
    between = [draw_noise(_FLYWHEEL, total.size, interval, rng) for _ in range(number - 1)]
    ends = [np.zeros(total.size), *between, total]
    return [later - earlier for earlier, later in itertools.pairwise(ends)]


def _slug(record: Record) -> str:
    """Name of a data file: sorts by time."""
    from clockgeo.times import iso_utc

    return iso_utc(record.start, digits=0).replace(":", "").replace("-", "")
