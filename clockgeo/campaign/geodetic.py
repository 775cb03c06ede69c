"""The geodetic side of the comparison: ΔC from heights and a geoid, or known numbers."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from clockgeo.campaign.results import Comparison
from clockgeo.campaign.schema import Campaign, GeoidSource
from clockgeo.errors import DataError
from clockgeo.files import shipped_grid
from clockgeo.gravity import Separation, number_from_ellipsoidal_height
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.levelling.solution import Solution
from clockgeo.levelling.stations import Site

if TYPE_CHECKING:
    from clockgeo.gravity import GeoidModel

__all__ = ["GeodeticNumbers", "campaign_geoid", "compare", "geodetic_numbers", "geoid_path"]


@dataclass(frozen=True, eq=False)
class GeodeticNumbers:
    """Geopotential numbers of sites from geodesy alone.

    Attributes
    ----------
    sites : tuple of str, length K
    values : float array, shape (K,)
        C in m² s⁻², in the campaign's zero level and tide system.
    covariance : float array, shape (K, K)
        m⁴ s⁻⁴.
    source : str
        Where they come from.
    """

    sites: tuple[str, ...]
    values: np.ndarray
    covariance: np.ndarray
    source: str

    def difference(self, first: str, second: str) -> tuple[float, float]:
        """Second minus first, and its u, in m² s⁻²."""
        weights = np.array([float(s == second) - float(s == first) for s in self.sites])
        variance = float(weights @ self.covariance @ weights)
        return float(weights @ self.values), variance**0.5


def geoid_path(source: GeoidSource, folder: Path) -> Path:
    """Find the grid beside the document, or among those that come with clockgeo."""
    beside = folder / source.grid
    if beside.is_file():
        return beside
    try:
        return shipped_grid(source.grid)
    except FileNotFoundError:
        raise DataError(
            "the geoid grid is not there",
            value=source.grid,
            where="[geoid], grid",
            advice="Give a path relative to the document, or the name of a shipped grid",
        ) from None


def campaign_geoid(source: GeoidSource, folder: Path) -> GeoidModel:
    """Open the geoid model that `[geoid]` names, with what it states.

    Raises
    ------
    ConventionError
        If the grid's conventions are missing or do not fit.
    DataError
        If the grid is not there.
    """
    from clockgeo.gravity import open_geoid  # heavy: only where a geoid is named

    return open_geoid(
        geoid_path(source, folder),
        quantity=source.quantity,
        tide_system=source.tide_system,
        zero_level=source.zero_level,
        ellipsoid=source.ellipsoid,
        interpolation=source.interpolation,
        u=source.u,
        correlation_length=source.correlation_length,
        fitted_to=source.fitted_to,
    )


def geodetic_numbers(
    campaign: Campaign, folder: Path, solved: Sequence[str]
) -> GeodeticNumbers | None:
    """Geopotential numbers of the solved sites from ellipsoidal heights and the geoid.

    Returns None where the document names no geoid or fewer than two sites have ellipsoidal heights.

    Raises
    ------
    ConventionError
        If the grid's conventions are missing or do not fit.
    DataError
        If the grid is not there or a site lies outside it.
    """
    sites = [campaign.site(name) for name in solved]
    placed = [site for site in sites if site.ellipsoidal_height is not None]
    if campaign.geoid is None or len(placed) < 2:
        return None
    source = campaign.geoid
    model = campaign_geoid(source, folder)
    latitude = np.array([site.latitude for site in placed])
    longitude = np.array([site.longitude for site in placed])
    separation = np.asarray(model.sample(latitude, longitude))
    errors = model.covariance(latitude, longitude)
    values, slopes = np.zeros(len(placed)), np.zeros(len(placed))
    for place, site in enumerate(placed):
        values[place], slopes[place] = _number(campaign, model, site, float(separation[place]))
    own = np.diag([site.u_ellipsoidal_height**2 for site in placed])
    return GeodeticNumbers(
        sites=tuple(site.id for site in placed),
        values=values,
        covariance=np.outer(slopes, slopes) * (errors + own),
        source=f"ellipsoidal heights and {source.grid}{_fit(model)}{_converted(model, campaign)}",
    )


def _fit(model: GeoidModel) -> str:
    """Say it where a model owes its values to levelling: it then speaks for that datum."""
    return f", fitted to {model.fitted_to}" if model.hybrid and model.fitted_to else ""


def _converted(model: GeoidModel, campaign: Campaign) -> str:
    """Say it where the model's own conventions are not the campaign's."""
    own, wanted = model.tide_system, campaign.head.tide_system
    return "" if own == wanted else f", converted from {own.value} to {wanted.value}"


def _number(
    campaign: Campaign, model: GeoidModel, site: Site, separation: float
) -> tuple[float, float]:
    """C of one site in the campaign's conventions, and dC/dh."""
    head = campaign.head
    surface = Separation(
        separation, 0.0, model.quantity, model.tide_system, model.zero_level, model.ellipsoid
    )

    def at(height: float) -> float:
        number = number_from_ellipsoidal_height(
            height,
            surface,
            latitude=site.latitude,
            height_tide_system=head.ellipsoidal_tide_system or head.tide_system,
            tide_system=head.tide_system,
            gravity=site.gravity,
        )
        return number.counted_from(head.zero_level).value

    assert site.ellipsoidal_height is not None
    return at(site.ellipsoidal_height), at(site.ellipsoidal_height + 1.0) - at(
        site.ellipsoidal_height
    )


def compare(
    campaign: Campaign,
    solution: Solution,
    pairs: Sequence[tuple[str, str]],
    geodetic: GeodeticNumbers | None,
) -> Iterator[Comparison]:
    """Set the clocks' differences against geodesy, for every pair that has both."""
    sources = [source for source in (geodetic, _known_numbers(campaign)) if source is not None]
    for source in sources:
        for first, second in pairs:
            if first not in source.sites or second not in source.sites:
                continue
            combination = {NumberOf(second): 1.0, NumberOf(first): -1.0}
            clock, u_clock = solution.value(combination), solution.u(combination)
            value, u_value = source.difference(first, second)
            u = float(np.hypot(u_clock, u_value))
            yield Comparison(
                from_site=first,
                to_site=second,
                clock=clock,
                u_clock=u_clock,
                geodetic=value,
                u_geodetic=u_value,
                difference=clock - value,
                u=u,
                normalised_error=(clock - value) / u if u else 0.0,
                source=source.source,
            )


def _known_numbers(campaign: Campaign) -> GeodeticNumbers | None:
    """Numbers stated in the document for sites beside the reference."""
    known = [site for site in campaign.sites if site.geopotential_number is not None]
    if len(known) < 2:
        return None
    return GeodeticNumbers(
        sites=tuple(site.id for site in known),
        values=np.array([site.geopotential_number for site in known]),
        covariance=np.diag([site.u_geopotential_number**2 for site in known]),
        source="geopotential numbers stated in the document",
    )
