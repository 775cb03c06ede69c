"""From the document's tables of a height network to rows of the linear model."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import islice
from pathlib import Path

from clockgeo.campaign.document import Document
from clockgeo.campaign.geodetic import campaign_geoid, geoid_path
from clockgeo.campaign.results import Input
from clockgeo.campaign.schema import Campaign
from clockgeo.errors import DataError
from clockgeo.files import sha256_of
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.network.columns import Columns, read_columns
from clockgeo.network.datum_rows import add_datum, datum_columns, refuse_points_in_two_datums
from clockgeo.network.gnss_rows import add_gnss, gnss_columns
from clockgeo.network.observations import add_levelling, add_tide_gauges, line_columns
from clockgeo.network.points import POINT_NUMBERS, POINT_TEXTS, Points, gather_points
from clockgeo.network.tables import Datum, GnssHeights, Levelling
from clockgeo.network.terms import TermFrame

__all__ = ["NetworkRows", "add_network"]


@dataclass(frozen=True, eq=False)
class NetworkRows:
    """What the document's network tables became.

    Attributes
    ----------
    points : Points
    groups : dict of str to list of str
        Group -> ids of its rows: each levelling, datum, GNSS table, and the tide gauges.
    datums : dict of str to TermFrame
    geoid : TermFrame or None
        Frame of the geoid model's terms, with the rows of all GNSS tables.
    inputs : tuple of Input
        Files that were read.
    """

    points: Points
    groups: dict[str, list[str]]
    datums: dict[str, TermFrame]
    geoid: TermFrame | None
    inputs: tuple[Input, ...]


def add_network(builder: ModelBuilder, document: Document) -> NetworkRows:
    """Read the network tables of a document and add their rows.

    Raises
    ------
    DataError, ConventionError
        If a table cannot be used; all bad rows of a file are named.
    """
    campaign, folder = document.campaign, document.folder
    tables: list[Levelling | Datum | GnssHeights] = [
        *campaign.levellings,
        *campaign.datums,
        *campaign.gnss,
    ]
    files = [campaign.network.points, *(table.file for table in tables)]
    inputs = [
        Input(path=name, sha256=sha256_of(_found(name, folder)))
        for name in files
        if name is not None
    ]
    points = _points(campaign, folder)
    tide_system = campaign.head.tide_system
    groups: dict[str, list[str]] = {}
    for levelling in campaign.levellings:
        lines = line_columns(levelling, _path(levelling.file, folder))
        groups[levelling.id] = add_levelling(
            builder, levelling, lines, points, tide_system=tide_system
        )
    published = {
        datum.id: datum_columns(datum, _path(datum.file, folder)) for datum in campaign.datums
    }
    refuse_points_in_two_datums(published, campaign.network.shared_points)
    datums: dict[str, TermFrame] = {}
    for datum in campaign.datums:
        frame = add_datum(builder, datum, published[datum.id], points, tide_system=tide_system)
        datums[datum.id], groups[datum.id] = frame, list(frame.rows)
    geoid, grid = _add_gnss(builder, campaign, folder, points, groups)
    gauges = add_tide_gauges(builder, campaign.tide_gauges, points)
    if gauges:
        groups["tide gauges"] = gauges
    return NetworkRows(points, groups, datums, geoid, (*inputs, *grid))


def _found(name: str, folder: Path) -> Path:
    path = folder / name
    if not path.is_file():
        raise DataError(
            "a table of the document is not there",
            value=name,
            where=str(folder),
            advice="Give its path relative to the document",
        )
    return path


def _path(name: str | None, folder: Path) -> str | None:
    return None if name is None else str(_found(name, folder))


def _points(campaign: Campaign, folder: Path) -> Points:
    path = _path(campaign.network.points, folder)
    benchmarks: Columns | None = None
    if path is not None:
        benchmarks = read_columns(
            path,
            texts=POINT_TEXTS,
            numbers=POINT_NUMBERS,
            required=("id", "latitude", "longitude"),
        )
    return gather_points(campaign.sites, benchmarks)


def _add_gnss(
    builder: ModelBuilder,
    campaign: Campaign,
    folder: Path,
    points: Points,
    groups: dict[str, list[str]],
) -> tuple[TermFrame | None, list[Input]]:
    if not campaign.gnss:
        return None, []
    if campaign.geoid is None:
        raise DataError(
            "GNSS heights need a geoid model",
            where=f"[[gnss]] {campaign.gnss[0].id}",
            advice="Name a grid in [geoid]; it also states u and correlation_length",
        )
    tables = [(gnss, gnss_columns(gnss, _path(gnss.file, folder))) for gnss in campaign.gnss]
    frame = add_gnss(
        builder,
        tables,
        points,
        geoid=campaign_geoid(campaign.geoid, folder),
        terms=campaign.network.geoid_terms,
        tide_system=campaign.head.tide_system,
        zero_level=campaign.head.zero_level,
    )
    rows = iter(frame.rows)
    for gnss, columns in tables:
        groups[gnss.id] = list(islice(rows, len(columns)))
    grid = Input(path=campaign.geoid.grid, sha256=sha256_of(geoid_path(campaign.geoid, folder)))
    return frame, [grid]
