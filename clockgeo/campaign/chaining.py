"""A session whose ratio comes along a chain of comparators in the open exchange format."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

from clockgeo.campaign.schema import ChainSource, Session
from clockgeo.errors import DataError
from clockgeo.files import sha256_of
from clockgeo.frequency.chain import Chain, chain_record, find_chains
from clockgeo.frequency.exchange import read_exchange, read_output
from clockgeo.frequency.record import Record, Source

__all__ = ["read_chain"]


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
        With notes on the chain, on what each path gave, and on the corrections that the headers
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
    names = dict.fromkeys(link.comparator.name for chain in chains for link in chain.links)
    outputs = {
        name: read_output(
            folder, name, experimental=source.experimental, skip_bad_rows=skip_bad_rows
        )
        for name in names
    }
    record, counts = chain_record(chains, outputs, name=session.id)
    record = _within(record, session)
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
        notes=(*_path_notes(chains, counts), *_ledger(chains[0]), *record.notes),
    )


def _within(record: Record, session: Session) -> Record:
    """Part of a record between the session's stated times."""
    from clockgeo.times import tai_from_iso

    keep = record.usable.copy()
    if session.start is not None:
        keep &= record.tai_ns >= tai_from_iso(session.start.isoformat())
    if session.planned_stop is not None:
        keep &= record.tai_ns < tai_from_iso(session.planned_stop.isoformat())
    if not keep.any():
        raise DataError(
            "the chain has no valid epoch within the session's times",
            where=f"session {session.id}",
            advice="Compare its start and stop with the data files",
        )
    return replace(
        record,
        tai_ns=record.tai_ns[keep],
        y=record.y[keep],
        usable=record.usable[keep],
        tick=record.tick[keep],
    )


def _path_notes(chains: list[Chain], counts: list[int]) -> list[str]:
    return [
        f"chain {chain.words}: {count} epochs"
        + ("" if place == 0 else ", where no earlier chain is complete")
        for place, (chain, count) in enumerate(zip(chains, counts, strict=True))
        if count or place == 0
    ]


def _ledger(chain: Chain) -> list[str]:
    """Say of every correction and uncertainty in the headers that it was not applied, and why."""
    notes = []
    for link in chain.links:
        one = link.comparator
        redshifts = [
            f"{name} {value:.6g}"
            for name, value in (("grsA", one.redshift_a), ("grsB", one.redshift_b))
            if value is not None
        ]
        if redshifts:
            notes.append(
                f"{one.name}: {', '.join(redshifts)} not applied: the redshift is what is measured"
            )
        stated = [
            f"{name} {value:.3g}"
            for name, value in (("uA_sys", one.u_a), ("uB_sys", one.u_b))
            if value is not None
        ]
        if stated:
            notes.append(
                f"{one.name}: {', '.join(stated)} not used: the effects of clocks and links in the "
                "document count, once"
            )
    return notes
