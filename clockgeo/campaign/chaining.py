"""A session whose ratio comes along a chain of comparators in the open exchange format."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path

import numpy as np

from clockgeo.campaign.schema import ChainSource, Session
from clockgeo.errors import DataError
from clockgeo.files import sha256_of
from clockgeo.frequency import fit_noise, mean_covariance
from clockgeo.frequency.chain import Chain, find_chains
from clockgeo.frequency.combination import Combined, Loop, combine, loops_of
from clockgeo.frequency.comparator import Comparator
from clockgeo.frequency.exchange import ExchangeFolder, read_exchange, read_outputs, rows_state_u
from clockgeo.frequency.record import Record, Source
from clockgeo.levelling.closures import signed_names

__all__ = ["read_chain"]

_LIMIT = 3.0
"""A loop of comparators closes within so many standard uncertainties."""
_ROUNDING = 1e-21


def read_chain(
    source: ChainSource,
    session: Session,
    base: Path,
    *,
    nominal_ratio: Fraction,
    skip_bad_rows: bool = False,
) -> Record:
    """Read the comparators of a session and form the ratio of its two clocks.

    Parameters
    ----------
    source : ChainSource
    session : Session
        Its start and stop, where stated, say which part of the outputs belongs to it.
    base : Path
        Folder that the name of the exchange folder is relative to.
    nominal_ratio : Fraction
        Exact nominal ratio that y is referred to; that of the headers may be another one.
    skip_bad_rows : bool
        See `read_record`.

    Returns
    -------
    Record
        With notes on the paths, on how their loops close, and on the corrections that the files
        offer and that were not applied.

    Raises
    ------
    DataError
        If the folder or its data cannot be used, or no chain leads from clock to clock.
    """
    folder = read_exchange(base / source.folder)
    chains = find_chains(
        folder.comparators, denominator=source.denominator, numerator=source.numerator
    )
    outputs = read_outputs(
        folder, _names(chains), experimental=source.experimental, skip_bad_rows=skip_bad_rows
    )
    _refuse_unknown_noise(source, outputs)
    outputs, chains = _within(outputs, chains, session)
    combined = combine(chains, outputs, name=session.id, noise=source.noise)
    record, loops = combined.record, [_closed(loop) for loop in loops_of(chains, outputs)]
    step = float(chains[0].nominal_ratio / nominal_ratio - 1)
    headers = tuple(
        Source(f"{source.folder}/{name}", sha256_of(folder.path / name))
        for name, _ in folder.headers
    )
    data = tuple(replace(one, path=f"{source.folder}/{one.path}") for one in record.sources)
    return replace(
        record,
        y=record.y + step,
        sources=(*headers, *data),
        notes=(
            *_path_notes(chains, combined),
            *(loop.words for loop in loops),
            *(note for name in outputs for note in _ledger(folder, folder.comparators[name])),
            *record.notes,
        ),
        doubts=tuple(
            f"paths of comparators contradict each other: {loop.words}; the ratio is an average of "
            "both, find out which is right and leave the other out"
            for loop in loops
            if not loop.closes
        ),
    )


def _names(chains: Sequence[Chain]) -> list[str]:
    """Comparators of any chain, each once."""
    return list(dict.fromkeys(link.comparator.name for c in chains for link in c.links))


def _refuse_unknown_noise(source: ChainSource, outputs: Mapping[str, Record]) -> None:
    unknown = [name for name in source.noise if name not in outputs]
    if unknown:
        raise DataError(
            "the noise of a comparator is stated that no path needs",
            value=", ".join(unknown),
            where=source.folder,
            allowed=f"Comparators {', '.join(outputs)}",
        )


def _within(
    outputs: Mapping[str, Record], chains: Sequence[Chain], session: Session
) -> tuple[dict[str, Record], list[Chain]]:
    """Outputs between the session's stated times, and the chains that have any then."""
    parts = {name: _part(record, session) for name, record in outputs.items()}
    left = {name: part for name, part in parts.items() if part is not None}
    whole = [chain for chain in chains if all(link.comparator.name in left for link in chain.links)]
    if not whole:
        raise DataError(
            "the chain has no valid epoch within the session's times",
            where=f"session {session.id}",
            advice="Compare its start and stop with the data files",
        )
    return {name: left[name] for name in _names(whole)}, whole


def _part(record: Record, session: Session) -> Record | None:
    from clockgeo.times import tai_from_iso

    keep = np.ones(len(record), dtype=bool)
    if session.start is not None:
        keep &= record.tai_ns >= tai_from_iso(session.start.isoformat())
    if session.planned_stop is not None:
        keep &= record.tai_ns < tai_from_iso(session.planned_stop.isoformat())
    if keep.all():
        return record
    if not np.any(keep & record.usable):
        return None
    return replace(
        record,
        tai_ns=record.tai_ns[keep],
        y=record.y[keep],
        usable=record.usable[keep],
        tick=record.tick[keep],
    )


def _path_notes(chains: Sequence[Chain], combined: Combined) -> list[str]:
    notes = [
        f"chain {chain.words}: complete at {count} epochs"
        for chain, count in zip(chains, combined.complete, strict=True)
    ]
    if combined.several:
        notes.append(
            f"{combined.several} epochs have several paths, combined by least squares with each "
            "comparator's noise; what paths share counts once"
        )
    return notes


@dataclass(frozen=True)
class _ClosedLoop:
    """What is said of a loop of comparators."""

    words: str
    closes: bool


def _closed(loop: Loop) -> _ClosedLoop:
    """How a loop of comparators closes, with the statistical u of its mean."""
    words = f"loop {signed_names(loop.names, loop.signs)}"
    mean, count = float(loop.series.y.mean()), loop.series.y.size
    try:
        noise = fit_noise([loop.series], interval=loop.interval).averaged
    except DataError:
        text = f"{words}: misclosure {mean:.2e} over {count} epochs, too few for u"
        return _ClosedLoop(text, closes=True)
    u = float(mean_covariance(noise, [loop.series], interval=loop.interval)[0, 0]) ** 0.5
    # Outputs that repeat each other leave rounding, which is no misclosure.
    closes = abs(mean) <= _LIMIT * max(u, _ROUNDING)
    verdict = "closes" if closes else "does not close"
    return _ClosedLoop(f"{words}: misclosure {mean:.2e}, u {u:.2e}, {verdict}", closes)


def _ledger(folder: ExchangeFolder, one: Comparator) -> Iterator[str]:
    """Say of every correction and uncertainty in the files that it was not applied, and why."""
    redshifts = [
        f"{name} {value:.6g}"
        for name, value in (("grsA", one.redshift_a), ("grsB", one.redshift_b))
        if value is not None
    ]
    if redshifts:
        yield f"{one.name}: {', '.join(redshifts)} not applied: the redshift is what is measured"
    stated = [
        f"{name} {value:.3g}"
        for name, value in (("uA_sys", one.u_a), ("uB_sys", one.u_b))
        if value is not None
    ]
    if rows_state_u(folder, one.name):
        stated.append("column 4 of the data")
    if stated:
        yield (
            f"{one.name}: {', '.join(stated)} not used: the effects of clocks and links in the "
            "document count, once"
        )
