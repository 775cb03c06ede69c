"""Simulated comparators: a drawn ratio, spread over the chain that is to measure it."""

from __future__ import annotations

import itertools
from fractions import Fraction
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.campaign.schema import ChainSource
from clockgeo.errors import DataError
from clockgeo.files import write_text
from clockgeo.frequency import NoiseModel, Record, draw_noise
from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.exchange import read_exchange
from clockgeo.frequency.exchange_writing import output_text

__all__ = ["write_chain"]

_FLYWHEEL = NoiseModel(white_fm=1e-14, flicker_fm=2e-15)
"""Noise of lasers and masers between the clocks; it drops out of the chain."""


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
        Names the exchange folder, whose headers must be there, and the two oscillators.
    record : Record
        Drawn fractional ratio of the two clocks; its unusable rows get flag 0 everywhere.
    nominal_ratio : Fraction
        That the drawn ratio refers to.
    tables : Path
        Folder that the exchange folder's headers are found from.
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
    exchange = read_exchange(tables / source.folder)
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
