"""What varies at the sites of a campaign: tables of pole tide and loading, and the epoch."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

from clockgeo.campaign.schema import Campaign
from clockgeo.errors import DataError
from clockgeo.gravity import Place, SiteTide, read_load_table, read_pole_coordinates
from clockgeo.levelling.stations import Site
from clockgeo.times import DAY_NS, tai_from_iso

__all__ = ["site_tide", "tide_tables", "years_from_epoch"]

_JULIAN_YEAR_NS = 365.25 * DAY_NS


def site_tide(campaign: Campaign, site: Site, folder: Path) -> SiteTide:
    """Tide of Moon and Sun at a site, with the pole tide and loading the document names.

    Parameters
    ----------
    campaign : Campaign
    site : Site
    folder : Path
        Where relative file names start.

    Raises
    ------
    DataError
        If a table is missing or cannot be used.
    """
    pole = campaign.head.pole_coordinates
    return SiteTide(
        Place(site.latitude, site.longitude, site.ellipsoidal_height or 0.0),
        pole=None if pole is None else read_pole_coordinates(_found(pole, folder)),
        load=None
        if site.load is None
        else read_load_table(_found(site.load, folder), gravity=site.gravity),
    )


def tide_tables(campaign: Campaign) -> list[str]:
    """Names of all tables that the tide of the campaign is taken from, as in the document."""
    named = [campaign.head.pole_coordinates, *(site.load for site in campaign.sites)]
    return sorted({name for name in named if name is not None})


def years_from_epoch(campaign: Campaign, tai_ns: int) -> float:
    """Julian years from the document's epoch (noon) to an instant; 0 if it states none."""
    epoch = campaign.head.epoch
    if epoch is None:
        return 0.0
    noon = datetime(epoch.year, epoch.month, epoch.day, 12, tzinfo=UTC)
    return (tai_ns - tai_from_iso(noon.isoformat())) / _JULIAN_YEAR_NS


def _found(name: str, folder: Path) -> Path:
    path = folder / name
    if not path.is_file():
        raise DataError(
            "a table for the tide is not there",
            value=name,
            advice="File names are relative to the folder of the campaign document",
        )
    return path
