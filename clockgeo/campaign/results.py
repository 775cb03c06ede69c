"""What `level` finds: the published names of `result.json`, with units.

Fractional frequencies are dimensionless, potentials in m² s⁻², heights in m, times ISO 8601 in UTC;
every u is a standard uncertainty (k = 1). `null` stands for what could not be computed, and a note
says why.
"""

from __future__ import annotations

from typing import Literal

from pydantic import ConfigDict, Field

from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.tables import Table as DocumentTable

__all__ = [
    "ClosureResult",
    "Comparison",
    "Conventions",
    "CorrelationResult",
    "CovarianceTable",
    "DifferenceResult",
    "EffectLine",
    "FitResult",
    "Heights",
    "Input",
    "LevelResult",
    "NoiseResult",
    "Provenance",
    "Quantity",
    "ScatterResult",
    "SessionResult",
    "SiteResult",
]

LEVEL_SCHEMA = "clockgeo/level/1"


class Table(DocumentTable):
    """A part of a result; made by name in Python, written under its published name."""

    model_config = ConfigDict(validate_by_name=True, validate_by_alias=True)


class Quantity(Table):
    """A value and its standard uncertainty."""

    value: float
    u: float | None


class Heights(Table):
    """Heights of a marker in m, one for each definition; null where an input is missing."""

    normal: Quantity | None
    orthometric: Quantity | None
    dynamic: Quantity | None


class SiteResult(Table):
    """A site with its geopotential number and heights."""

    id: str
    name: str
    latitude: float
    longitude: float
    geopotential_number: float
    u: float
    zero_level: str
    tide_system: TideSystem
    heights: Heights


class SessionResult(Table):
    """One session: its mean fractional frequency and what was done to it."""

    id: str
    numerator_clock: str
    numerator_site: str
    denominator_clock: str
    denominator_site: str
    start: str
    stop: str
    y: float
    """Mean over valid epochs after all corrections."""
    u_statistical: float
    """From the noise of the session itself."""
    u_systematic: float
    u_scatter: float
    """Excess scatter between sessions, the same for all."""
    u: float
    """All three together."""
    uptime: float
    valid_seconds: float
    span_seconds: float
    interval: float
    correction: float
    """Sum of the systematic corrections that were added."""
    tide_correction: float
    """Mean of the tide correction that was added, over the valid epochs."""
    u_tide_correction: float
    flagged: dict[str, int]
    """Reason -> number of epochs that do not count."""
    y_without_screening: float
    """The same mean with every usable epoch."""
    residual: float
    """Observed minus adjusted, fractional."""
    notes: tuple[str, ...]


class DifferenceResult(Table):
    """Second site minus first."""

    from_site: str = Field(alias="from")
    to_site: str = Field(alias="to")
    geopotential_difference: float
    u: float
    height_difference: float
    """Normal height of `to` minus that of `from`, in m."""
    u_height_difference: float
    coverage_factor_95: float
    """k of the 95 % interval, from the effective degrees of freedom."""
    degrees_of_freedom: float | None
    """Effective degrees of freedom of u; null means infinite."""


class CovarianceTable(Table):
    """Covariance of the sites' geopotential numbers in m⁴ s⁻⁴."""

    order: tuple[str, ...]
    matrix: tuple[tuple[float, ...], ...]


class EffectLine(Table):
    """Part of one cause in the uncertainty of one difference."""

    from_site: str = Field(alias="from")
    to_site: str = Field(alias="to")
    effect: str
    kind: str
    """statistics, scatter, effect or geodetic."""
    y: float
    """Standard uncertainty as fractional frequency."""
    potential: float
    """The same in m² s⁻²."""
    height_mm: float
    """The same in mm of height."""


class CorrelationResult(Table):
    """Correlation coefficient of two quantities of one kind, and what it comes from."""

    kind: Literal["session", "geopotential_number", "difference"]
    """Means of two sessions; numbers of two sites (and with them their heights); differences."""
    first: str
    second: str
    """Ids of sessions or sites, or `to - from` of differences."""
    coefficient: float
    parts: dict[str, float]
    """Shared effect or cause -> its part; the parts add up to the coefficient."""


class ClosureResult(Table):
    """A closed loop of clock sessions, each clock at its site."""

    sessions: tuple[str, ...]
    signs: tuple[int, ...]
    """+1 where a session is run from denominator to numerator."""
    misclosure: float
    """m² s⁻²"""
    u: float
    """With all shared effects, without excess scatter between sessions."""
    normalised: float | None
    """Misclosure over its u; null for an identity."""
    verdict: str
    """closes; does not close (beyond 3 u); or identity: it follows from its own sessions, or from
    the loops before it, because they are made of the same data; no check."""


class FitResult(Table):
    """Global test of the session means against the solution."""

    chi_squared: float
    degrees_of_freedom: int
    p_value: float | None


class ScatterResult(Table):
    """Excess scatter between sessions beyond their statistical uncertainty, fractional."""

    standard_deviation: float
    lower: float
    upper: float | None
    """Ends of the 95 % interval; null where there is no upper limit."""
    birge_ratio: float | None
    applied: bool
    """Whether it is part of the stated u."""


class NoiseResult(Table):
    """Noise model fitted to the sessions of one pair of clocks (see `stability`)."""

    pair: str
    sessions: tuple[str, ...]
    white_pm: float | None
    flicker_pm: float | None
    white_fm: float | None
    flicker_fm: float | None
    random_walk_fm: float | None
    drift: float | None
    source: str
    """fitted, or stated in the document where the record is too short for a fit."""


class Comparison(Table):
    """Clocks against geodesy for one difference, in m² s⁻²."""

    from_site: str = Field(alias="from")
    to_site: str = Field(alias="to")
    clock: float
    u_clock: float
    geodetic: float
    u_geodetic: float
    difference: float
    """Clock minus geodetic."""
    u: float
    normalised_error: float
    """Difference over its standard uncertainty."""
    source: str
    """Where the geodetic value comes from."""


class Conventions(Table):
    """What the numbers mean."""

    sign: str
    zero_level: str
    w0: float
    tide_system: TideSystem
    reference_site: str
    tide: str
    ellipsoid: str
    caution: str


class Input(Table):
    """A file that was read."""

    path: str
    sha256: str


class Provenance(Table):
    """What made the result."""

    version: str
    inputs: tuple[Input, ...]


class LevelResult(Table):
    """Everything that `clockgeo level` finds."""

    schema_name: str = Field(default=LEVEL_SCHEMA, alias="schema")
    name: str
    conventions: Conventions
    sessions: tuple[SessionResult, ...]
    sites: tuple[SiteResult, ...]
    differences: tuple[DifferenceResult, ...]
    covariance: CovarianceTable
    effects: tuple[EffectLine, ...]
    fit: FitResult
    scatter: ScatterResult | None
    noise: tuple[NoiseResult, ...]
    correlations: tuple[CorrelationResult, ...] = ()
    closures: tuple[ClosureResult, ...] = ()
    comparison: tuple[Comparison, ...]
    notes: tuple[str, ...]
    provenance: Provenance
