"""What `plan` finds, as tables that become `plan.json`."""

from __future__ import annotations

from pydantic import Field

from clockgeo.campaign.results import Conventions, Provenance, Table

__all__ = [
    "PLAN_SCHEMA",
    "AlternativeResult",
    "ConfirmedTarget",
    "ConfirmationResult",
    "CostResult",
    "LimitResult",
    "OptimumResult",
    "PlanResult",
    "PlannedSession",
    "ReachCurve",
    "SensitivityLine",
    "ShareResult",
    "SitePlace",
    "StayResult",
    "TargetResult",
    "TechniqueCurves",
    "TermLine",
]

PLAN_SCHEMA = "clockgeo/plan/1"


class _Pair(Table):
    """Two sites or two datums."""

    from_end: str = Field(alias="from")
    to_end: str = Field(alias="to")


class TargetResult(_Pair):
    """One target and whether the plan reaches it."""

    kind: str
    """height_difference between sites, or datum_offset between datums."""
    required_u: float
    """m"""
    predicted_u: float
    """m"""
    reached: bool
    floor_u: float
    """With endless time in every session, m."""
    full_uptime_u: float
    """With full uptime in every session, m."""
    time_factor: float | None
    """All sessions' lengths times this reach the target; null where no length does."""
    stability_factor: float | None
    """White noise of all clocks and links times this reaches it."""
    uptime_factor: float | None
    """All uptimes times this reach it; null where even full uptime does not."""


class PlannedSession(Table):
    """One session of the plan."""

    id: str
    numerator_clock: str
    numerator_site: str
    denominator_clock: str
    denominator_site: str
    links: tuple[str, ...]
    start: str
    stop: str
    days: float
    uptime: float
    u_statistical: float
    """Of the session alone, fractional."""
    u_systematic: float
    """Of the session alone, fractional."""
    chosen: bool
    """Whether its length was found by the plan; false for sessions of the document."""


class LimitResult(_Pair):
    """What stops one target."""

    term: str
    """Largest term of the budget."""
    share: float
    """Its share of u squared."""
    effect: str | None
    """Largest single effect, owner and name."""
    effect_u: float | None
    """Its standard uncertainty on a session, fractional."""
    effect_factor: float | None
    """What it must be multiplied by to reach the target, all else as it is."""
    text: str


class TermLine(_Pair):
    """Part of one term in the predicted u of one target."""

    effect: str
    """Name of the term."""
    kind: str
    """statistics, effect, geodetic or other."""
    y: float
    """As fractional frequency."""
    potential: float
    """m² s⁻²"""
    height_mm: float


class AlternativeResult(_Pair):
    """The same difference by other techniques; distances and u in m."""

    distance: float
    u_clock: float
    u_levelling: float
    u_gnss_geoid: float
    break_even_distance: float | None
    """Beyond it levelling is less certain than the clocks; null where it never is."""


class TechniqueCurves(Table):
    """Standard uncertainty of a height difference against distance, m."""

    distance: tuple[float, ...]
    levelling: tuple[float, ...]
    gnss_geoid: tuple[float, ...]
    clocks: tuple[float, ...]
    """Largest predicted u of the targets between sites; the same at every distance."""


class SensitivityLine(_Pair):
    """One change of the plan and what it brings."""

    change: str
    u: float
    """With the change, m."""
    gain: float
    """Predicted u minus that, m; positive is better."""


class ReachCurve(_Pair):
    """u of a target against the time spent, by term."""

    days: tuple[float, ...]
    """All sessions together, d."""
    u: tuple[float, ...]
    """m"""
    terms: dict[str, tuple[float, ...]]
    """m; the squares add up to u squared."""


class SitePlace(Table):
    """A site of the plan."""

    id: str
    name: str
    latitude: float
    longitude: float
    used: bool
    """Whether a session of the plan takes place there."""


class StayResult(Table):
    """A clock stays at a site, and how it came there."""

    clock: str
    site: str
    start: str
    stop: str
    distance: float
    """From the stay before, m; 0 for the first."""


class CostResult(Table):
    """What the plan takes."""

    days: float
    moves: int
    distance: float
    """m"""
    total: float
    unit: str
    budget: float | None
    within_budget: bool | None
    last_stop: str
    deadline: str | None
    within_deadline: bool | None


class ShareResult(Table):
    """Days of one candidate."""

    id: str
    optimal_days: float
    """Of the continuous optimum."""
    days: float
    """Rounded to whole steps."""


class OptimumResult(Table):
    """How the candidates' days were shared out."""

    criterion: str
    unit: str
    value: float
    """Of the continuous optimum."""
    bound: float
    """No allocation is better than this."""
    certificate_gap: float
    """Value over bound minus one (difference of the logarithm for D)."""
    rounded_value: float
    rounding_gap: float
    """The same for the rounded days."""
    controlled: bool
    """Whether no site hangs on one session alone."""
    uncontrolled: tuple[str, ...]
    """Sessions that nothing else checks."""
    shares: tuple[ShareResult, ...]
    text: str


class ConfirmedTarget(_Pair):
    """Predicted and realised scatter of one target, m."""

    predicted_u: float
    realised_u: float
    """Root mean square of estimate minus truth."""
    lower: float
    upper: float
    """Where the realised u lies in 95 % of all such simulations if the prediction holds."""
    stated_u: float
    """Median of the u that the simulated campaigns state themselves."""
    agrees: bool


class ConfirmationResult(Table):
    """Simulated campaigns."""

    runs: int
    seed: int
    targets: tuple[ConfirmedTarget, ...]


class PlanResult(Table):
    """Everything that `clockgeo plan` finds."""

    schema_name: str = Field(default=PLAN_SCHEMA, alias="schema")
    name: str
    conventions: Conventions
    targets: tuple[TargetResult, ...]
    sessions: tuple[PlannedSession, ...]
    limits: tuple[LimitResult, ...]
    terms: tuple[TermLine, ...]
    alternatives: tuple[AlternativeResult, ...]
    techniques: TechniqueCurves | None
    """Null where no target is a difference between sites."""
    sensitivity: tuple[SensitivityLine, ...]
    reach: tuple[ReachCurve, ...]
    sites: tuple[SitePlace, ...]
    stays: tuple[StayResult, ...]
    costs: CostResult
    optimum: OptimumResult | None
    confirmation: ConfirmationResult | None
    notes: tuple[str, ...]
    provenance: Provenance
