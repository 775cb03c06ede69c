"""The campaign document: one TOML file from plan to report.

The tables are those of the wings; here they are put together and named as they stand in the file.
Lists have the singular name of TOML's arrays of tables (``[[site]]``) and a plural in Python.
"""

from __future__ import annotations

from datetime import UTC, date, datetime
from typing import Literal

from pydantic import Field, model_validator

from clockgeo.campaign.plan_schema import (
    Candidate,
    Difference,
    Placed,
    Plan,
    Target,
)
from clockgeo.frequency.layout import RecordLayout
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.screening import ScreeningRules
from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.levelling.stations import Clock, Link, Site
from clockgeo.network.tables import (
    Datum,
    GnssHeights,
    Levelling,
    NetworkSettings,
    TideGauge,
)
from clockgeo.tables import Identifier, Instant, NonNegative, Positive, Table, Uncertainty

__all__ = [
    "Campaign",
    "ChainSource",
    "Candidate",
    "Difference",
    "GeoidSource",
    "Head",
    "NominalRatio",
    "Placed",
    "Plan",
    "Session",
    "Target",
    "Truth",
]


class Head(Table):
    """`[campaign]`: what holds for the whole document."""

    name: str = Field(min_length=1, max_length=200)
    description: str = ""
    tide_system: TideSystem
    """Tide system of all potentials and heights given here and of the results."""
    ellipsoidal_tide_system: TideSystem | None = None
    """Tide system of the ellipsoidal heights where it differs; they are converted on use."""
    zero_level: str | float = "height_reference"
    """Zero level of all geopotential numbers: a name, or W0 in m² s⁻²."""
    reference_site: Identifier
    """Site whose geopotential number is taken as known."""
    epoch: date | None = None
    """Epoch of the heights and potentials."""
    tide: Literal["solid_earth", "none"] = "solid_earth"
    """Whether the time-variable solid-Earth tide is removed epoch by epoch."""
    pole_coordinates: str | None = None
    """File with observed coordinates of the rotation pole; adds the pole tide."""
    scatter: Literal["estimate", "by_stay", "none"] = "estimate"
    """Whether excess scatter is estimated and added to u: of each session, of each configuration
    (sessions for which both clocks stay where they are share one offset), or not at all."""
    screening: ScreeningRules = ScreeningRules()
    """How epochs of all records are flagged."""


class ChainSource(Table):
    """Where the ratio of a session comes along a chain of comparators."""

    folder: str
    """Folder in the open exchange format, relative to the document."""
    numerator: str = Field(min_length=1)
    """Oscillator of the numerator clock, as laboratory_oscillator."""
    denominator: str = Field(min_length=1)
    """Oscillator of the denominator clock."""
    experimental: bool = False
    """Whether rows flagged 1, valid but experimental, count beside those flagged 2."""
    noise: dict[str, Positive] = Field(default_factory=dict)
    """Comparator -> its own noise relative to the others, where several paths lead from clock to
    clock; 1 where none is stated."""


class Session(Table):
    """`[[session]]`: one comparison; planned without a record, measured with one."""

    id: Identifier
    numerator: Placed
    """The clock whose frequency stands in the numerator of the ratio."""
    denominator: Placed
    links: tuple[Identifier, ...] = ()
    """Links between the two clocks."""
    start: Instant | None = None
    stop: Instant | None = None
    hours: Positive | None = None
    """Planned length in hours, instead of a stop."""
    uptime: float = Field(default=1.0, ge=0.0, le=1.0)
    """Expected share of valid time."""
    record: RecordLayout | None = None
    """The measured record."""
    chain: ChainSource | None = None
    """Instead of a record: comparators that lead from one clock to the other."""
    screening: ScreeningRules | None = None
    """Rules for this record, where they differ from those of the campaign."""

    @property
    def measured(self) -> bool:
        """Whether the session has data: a record, or a chain of comparators."""
        return self.record is not None or self.chain is not None

    @property
    def places(self) -> tuple[Placed, Placed]:
        """Numerator and denominator."""
        return self.numerator, self.denominator

    @property
    def planned_stop(self) -> datetime | None:
        """Stop, given or from the length."""
        if self.stop is not None or self.start is None or self.hours is None:
            return self.stop
        return datetime.fromtimestamp(self.start.timestamp() + 3600.0 * self.hours, tz=UTC)

    @property
    def planned_seconds(self) -> float | None:
        """Length from start to stop in s, where both are stated."""
        stop = self.planned_stop
        return None if self.start is None or stop is None else (stop - self.start).total_seconds()

    @model_validator(mode="after")
    def _one_length(self) -> Session:
        if self.record is not None and self.chain is not None:
            message = "give either a record or a chain, not both"
            raise ValueError(message)
        if self.stop is not None and self.hours is not None:
            message = "give either stop or hours, not both"
            raise ValueError(message)
        if self.start and self.stop and self.stop <= self.start:
            message = f"stop {self.stop:%Y-%m-%dT%H:%MZ} is not after the start"
            raise ValueError(message)
        return self


class NominalRatio(Table):
    """`[[nominal_ratio]]`: what is known of the ratio of two different transitions."""

    numerator: Identifier
    """Transition of the numerator clock."""
    denominator: Identifier
    correction: float = 0.0
    """Added to y of such ratios."""
    u: Uncertainty
    """Standard uncertainty of the nominal ratio, fractional."""


class GeoidSource(Table):
    """`[geoid]`: the gridded model for the comparison; states what its file does not say."""

    grid: str
    """A file relative to the document, or the name of a grid that comes with clockgeo."""
    quantity: Literal["geoid_height", "height_anomaly"] | None = None
    tide_system: TideSystem | None = None
    zero_level: str | float | None = None
    ellipsoid: str | None = None
    interpolation: Literal["bilinear", "biquadratic", "bicubic"] | None = None
    u: NonNegative | None = None
    """Standard uncertainty of a value in m."""
    correlation_length: Positive | None = None
    """Distance in m over which the model's errors are alike."""
    fitted_to: str | None = None
    """Levelling datum that a hybrid model was fitted to; such a model is no check of it."""


class Truth(Table):
    """`[truth]`: what `simulate` draws from."""

    geopotential_numbers: dict[Identifier, float]
    """Site -> true C of the marker in m² s⁻², in the document's zero level and tide system."""
    nominal_ratio_errors: dict[Identifier, float] = Field(default_factory=dict)
    """Species of the numerator clock "/" that of the denominator -> error of the nominal ratio."""
    instability: dict[Identifier, NoiseModel] = Field(default_factory=dict)
    """Clock or link -> true noise, where it differs from the stated model."""
    session_scatter: NonNegative = 0.0
    """Standard deviation of an extra offset drawn for each session, fractional."""
    interval: Positive = 1.0
    """Sampling interval in s."""
    stamp_decimals: int = Field(default=6, ge=5, le=11)
    """Decimals of the printed MJD; 6 is 0.09 s."""
    mean_run: Positive = 3600.0
    """Mean length of a stretch of valid data in s, where the uptime is below 1."""
    outliers_per_day: NonNegative = 0.0
    """Mean number of outliers in a day."""
    outlier_size: Positive = 20.0
    """Their size in units of the standard deviation of neighbouring samples."""
    written_as: Literal["fractional", "ratio"] = "fractional"
    """Whether records hold y or the full ratio."""


class Campaign(Table):
    """The whole document."""

    head: Head = Field(alias="campaign")
    sites: tuple[Site, ...] = Field(alias="site", min_length=1)
    clocks: tuple[Clock, ...] = Field(default=(), alias="clock")
    links: tuple[Link, ...] = Field(default=(), alias="link")
    sessions: tuple[Session, ...] = Field(default=(), alias="session")
    nominal_ratios: tuple[NominalRatio, ...] = Field(default=(), alias="nominal_ratio")
    geoid: GeoidSource | None = None
    network: NetworkSettings = NetworkSettings()
    datums: tuple[Datum, ...] = Field(default=(), alias="datum")
    levellings: tuple[Levelling, ...] = Field(default=(), alias="levelling")
    gnss: tuple[GnssHeights, ...] = ()
    tide_gauges: tuple[TideGauge, ...] = Field(default=(), alias="tide_gauge")
    target: Target | None = None
    plan: Plan = Plan()
    candidates: tuple[Candidate, ...] = Field(default=(), alias="candidate")
    truth: Truth | None = None

    def site(self, name: str) -> Site:
        """Return the site of that id."""
        return next(site for site in self.sites if site.id == name)

    def clock(self, name: str) -> Clock:
        """Return the clock of that id."""
        return next(clock for clock in self.clocks if clock.id == name)

    def link(self, name: str) -> Link:
        """Return the link of that id."""
        return next(link for link in self.links if link.id == name)
