"""What `adjust` finds: the published names of its `result.json`, with units.

Beside the names of `level`: offsets in m and m² s⁻², tilts in m a metre, residuals and biases in
m² s⁻². `null` stands for what the data do not determine, or for an infinite value; `text` and notes
say why.
"""

from __future__ import annotations

from pydantic import Field

from clockgeo.campaign.results import (
    Conventions,
    CovarianceTable,
    DifferenceResult,
    EffectLine,
    FitResult,
    NoiseResult,
    Provenance,
    ScatterResult,
    SessionResult,
    SiteResult,
    Table,
)

__all__ = [
    "AdjustResult",
    "BlunderResult",
    "ComponentResult",
    "DatumResult",
    "Epsg1046Result",
    "GeoidResult",
    "GlobalTest",
    "IdentifiabilityResult",
    "LoopResult",
    "ObservationResult",
    "PairResult",
    "ParameterShare",
    "PointResult",
    "RobustResult",
    "SuspectResult",
]

ADJUST_SCHEMA = "clockgeo/adjust/1"


class PointResult(Table):
    """A point of the net; sites are among them."""

    id: str
    latitude: float
    longitude: float
    geopotential_number: float | None
    u: float | None
    """null where the number is not estimable (u is infinite)."""
    normal_height: float | None


class PairResult(Table):
    """Difference of two points that was asked for, second minus first."""

    from_point: str = Field(alias="from")
    to_point: str = Field(alias="to")
    geopotential_difference: float | None
    u: float | None


class Epsg1046Result(Table):
    """The datum's plane as EPSG coordinate operation method 1046."""

    latitude: float
    longitude: float
    vertical_offset: float
    inclination_in_latitude: float
    """arc-seconds"""
    inclination_in_longitude: float
    """arc-seconds"""
    largest_departure: float
    """From the rigorous correction of a height at the datum's points, m."""
    wkt: str


class DatumResult(Table):
    """A vertical datum against the campaign's zero level: H = H_datum + offset + tilts."""

    id: str
    name: str
    kind: str
    points: int
    offset: float | None
    """m; positive where the datum's zero surface lies high."""
    u: float | None
    offset_potential: float | None
    """W0 of the campaign minus W0 of the datum, m² s⁻²."""
    u_offset_potential: float | None
    offset_above_height_reference: float | None
    """The same against the zero level of the height reference, m."""
    tilt_north: float | None
    """m a metre; 0 where it was not asked for."""
    tilt_east: float | None
    u_tilt_north: float | None
    u_tilt_east: float | None
    elevation_term: float | None
    u_elevation_term: float | None
    distance_term: float | None
    u_distance_term: float | None
    origin_latitude: float
    origin_longitude: float
    origin_gravity: float
    """Normal gravity that turns m² s⁻² into m."""
    epsg_1046: Epsg1046Result | None


class GeoidResult(Table):
    """Bias and tilts of the geoid model, in m and m a metre."""

    id: str
    bias: float | None
    u: float | None
    tilt_north: float | None
    tilt_east: float | None
    u_tilt_north: float | None
    u_tilt_east: float | None


class ObservationResult(Table):
    """An observation after adjustment."""

    id: str
    kind: str
    group: str
    points: tuple[str, ...]
    value: float
    u: float
    """Stated, shared effects included."""
    residual: float
    """Observed minus adjusted."""
    standardised: float | None
    """null where nothing controls the observation."""
    redundancy: float
    minimal_detectable_bias: float | None
    """null: infinite, no residual can show an error of this observation."""
    external_reliability: float | None
    """Effect of that bias on any combination of unknowns, in units of its u."""
    largest_effect: float | None
    """Largest change of a number or offset by that bias, m² s⁻²."""
    largest_effect_on: str | None


class GlobalTest(Table):
    """Whether the misfit is what the stated uncertainties let expect."""

    chi_squared: float
    degrees_of_freedom: int
    p_value: float | None
    lower: float | None
    upper: float | None
    """Two-sided 95 % limits of the variance factor."""
    passed: bool | None


class ComponentResult(Table):
    """Factor on the variance of a group of observations; 1 where the statement holds."""

    group: str
    observations: int
    factor: float
    u: float
    redundancy: float


class SuspectResult(Table):
    """An observation suspected of a blunder."""

    id: str
    bias: float
    u: float
    standardised: float
    alternatives: tuple[str, ...]


class BlunderResult(Table):
    """The search for blunders."""

    limit: float
    """Critical value of a standardised residual."""
    suspects: tuple[SuspectResult, ...]
    chi_squared: float
    degrees_of_freedom: int
    p_value: float | None
    """Global test once every suspect has a bias of its own."""
    text: str


class LoopResult(Table):
    """A closed loop of levelled lines."""

    observations: tuple[str, ...]
    signs: tuple[int, ...]
    misclosure: float
    u: float
    standardised: float


class ParameterShare(Table):
    """How much a parameter owes to prior knowledge and to data."""

    parameter: str
    estimable: bool
    prior_share: float
    data_share: float


class IdentifiabilityResult(Table):
    """What the observations determine."""

    unknowns: int
    rank: int
    gaps: tuple[str, ...]
    uncontrolled: tuple[str, ...]
    """Observations that nothing else checks."""
    shares: tuple[ParameterShare, ...]


class RobustResult(Table):
    """The robust adjustment beside the plain one."""

    rule: str
    scale: float
    down_weighted: dict[str, float]
    """Observation -> factor of its weight, where below 1."""
    largest_change: float
    """Largest change of a point's number, m² s⁻²."""
    at_point: str


class AdjustResult(Table):
    """Everything that `clockgeo adjust` finds."""

    schema_name: str = Field(default=ADJUST_SCHEMA, alias="schema")
    name: str
    conventions: Conventions
    zero_definition: str
    """What the zero level of the numbers hangs on."""
    sessions: tuple[SessionResult, ...]
    sites: tuple[SiteResult, ...]
    differences: tuple[DifferenceResult, ...]
    covariance: CovarianceTable
    effects: tuple[EffectLine, ...]
    fit: FitResult
    scatter: ScatterResult | None
    noise: tuple[NoiseResult, ...]
    points: tuple[PointResult, ...]
    pairs: tuple[PairResult, ...]
    datums: tuple[DatumResult, ...]
    geoid_models: tuple[GeoidResult, ...]
    observations: tuple[ObservationResult, ...]
    variance_factor: float | None
    global_test: GlobalTest
    variance_components: tuple[ComponentResult, ...]
    identifiability: IdentifiabilityResult
    blunders: BlunderResult
    loops: tuple[LoopResult, ...]
    """The loops that close worst."""
    robust: RobustResult | None
    notes: tuple[str, ...]
    provenance: Provenance
