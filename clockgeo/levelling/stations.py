"""What a campaign is made of: sites, clocks and links, as a user states them."""

from __future__ import annotations

from pydantic import Field

from clockgeo.frequency.noise import NoiseModel
from clockgeo.levelling.effects import EffectList
from clockgeo.tables import Identifier, Latitude, Longitude, Positive, Table, Uncertainty

__all__ = ["Clock", "Link", "Site"]


class Site(Table):
    """A place with a marker, and how the atoms of clocks stand above it."""

    id: Identifier
    name: str = ""
    """Name for people; the id if absent."""
    latitude: Latitude
    """Geodetic latitude in degrees, north positive."""
    longitude: Longitude
    """Longitude in degrees, east positive."""
    ellipsoidal_height: float | None = Field(default=None, ge=-12_000.0, le=10_000.0)
    """Height of the marker above the ellipsoid in m."""
    u_ellipsoidal_height: Uncertainty = 0.0
    """Standard uncertainty of the ellipsoidal height in m."""
    atoms_above_marker: float = Field(default=0.0, ge=-2_000.0, le=2_000.0)
    """Height of a clock's atoms above the marker in m."""
    atoms_of: dict[Identifier, float] = Field(default_factory=dict)
    """The same for single clocks that stand differently: clock id -> m."""
    u_atoms_above_marker: Uncertainty = 0.0
    """Standard uncertainty of the height of the atoms in m."""
    gravity: float | None = Field(default=None, ge=9.5, le=10.0)
    """Measured gravity at the marker in m s⁻²; normal gravity if absent."""
    u_gravity: Uncertainty = 0.0
    """Standard uncertainty of gravity in m s⁻²."""
    gravity_gradient: float | None = Field(default=None, ge=-1e-5, le=1e-5)
    """Measured change of gravity with height in s⁻²; the free-air value if absent."""
    load: str | None = None
    """File with the harmonic loading of the place (oceans and others), for the tide."""
    uplift_rate: float = Field(default=0.0, ge=-1.0, le=1.0)
    """Steady rise of the marker in m a⁻¹; brings sessions to the epoch of the campaign."""
    u_uplift_rate: Uncertainty = 0.0
    """Its standard uncertainty in m a⁻¹."""
    geopotential_number: float | None = None
    """Known C of the marker in m² s⁻²."""
    u_geopotential_number: Uncertainty = 0.0
    """Its standard uncertainty in m² s⁻²."""

    @property
    def label(self) -> str:
        """Name for people."""
        return self.name or self.id

    def atoms_height(self, clock: str) -> float:
        """Height of the atoms of `clock` above the marker in m."""
        return self.atoms_of.get(clock, self.atoms_above_marker)


class Clock(EffectList):
    """An optical clock: its transition, its instability and its systematic effects."""

    id: Identifier
    name: str = ""
    transition: Identifier | None = None
    """Name of a recommended transition, such as 87Sr; gives the nominal frequency."""
    nominal_frequency: str | None = Field(default=None, pattern=r"^\d{1,16}(\.\d{1,12})?$")
    """Exact decimal text in Hz, where the transition is not listed or another nominal is used."""
    instability: NoiseModel = NoiseModel()
    """Power-law model of the clock alone."""

    @property
    def species(self) -> str:
        """What must be equal in two clocks for their nominal ratio to be one."""
        return self.nominal_frequency or self.transition or self.id


class Link(EffectList):
    """A connection between two sites that carries a frequency."""

    id: Identifier
    name: str = ""
    instability: NoiseModel = NoiseModel()
    """Power-law model of the link alone."""
    length: Positive | None = None
    """Length in m; for the report only."""
    flywheel: NoiseModel | None = None
    """Of an oscillator that carries the frequency over the clock's downtime, where the link
    compares means over the whole session, as satellite links do; adds the dead-time term."""
