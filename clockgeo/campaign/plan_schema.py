"""What a plan must reach, and what it may choose from: targets, candidates, costs."""

from __future__ import annotations

from typing import Literal

from pydantic import Field, model_validator

from clockgeo.tables import Identifier, Instant, NonNegative, Positive, Table

__all__ = [
    "Candidate",
    "Costs",
    "DatumOffset",
    "Difference",
    "OtherTechniques",
    "Placed",
    "Plan",
    "Target",
]


class Placed(Table):
    """A clock at a site."""

    clock: Identifier
    site: Identifier


class Difference(Table):
    """A pair of sites and the standard uncertainty wanted for it."""

    from_site: Identifier = Field(alias="from")
    to_site: Identifier = Field(alias="to")
    u_height: Positive
    """Wanted standard uncertainty of the height difference in m."""


class DatumOffset(Table):
    """A pair of vertical datums and the standard uncertainty wanted for their offset."""

    from_datum: Identifier = Field(alias="from")
    to_datum: Identifier = Field(alias="to")
    u: Positive
    """Wanted standard uncertainty of the difference of their offsets in m."""


class Target(Table):
    """`[target]`: what a plan must reach."""

    differences: tuple[Difference, ...] = Field(default=(), alias="difference")
    offsets: tuple[DatumOffset, ...] = Field(default=(), alias="offset")
    deadline: Instant | None = None
    """When the last session must end."""
    budget: NonNegative | None = None
    """What all sessions and moves may cost, in the unit of the costs."""


class Costs(Table):
    """What things cost, in one unit of your own; nothing is built in."""

    day: NonNegative = 0.0
    """A day of a session."""
    move: NonNegative = 0.0
    """Moving one clock, whatever the distance."""
    kilometre: NonNegative = 0.0
    """Moving one clock by a kilometre, along the shortest way on the ellipsoid."""
    unit: str = "units"
    """Name of the unit, such as a currency."""


class OtherTechniques(Table):
    """What spirit levelling and GNSS with a geoid model would reach over the same distances."""

    levelling_per_root_km: NonNegative = 1e-3
    """Random part of spirit levelling in m for 1 km; grows with the root of the distance."""
    levelling_per_km: NonNegative = 0.0
    """Systematic part of spirit levelling in m a km; grows with the distance."""
    u_gnss: NonNegative = 0.01
    """Standard uncertainty of an ellipsoidal height in m."""
    u_geoid: NonNegative = 0.02
    """Standard uncertainty of a value of the geoid model in m."""
    geoid_correlation_length: Positive | None = None
    """Distance in m over which the geoid's errors are alike; independent if absent."""


class Candidate(Table):
    """`[[candidate]]`: a session that a plan may give days to, in the order of the journey."""

    id: Identifier
    numerator: Placed
    denominator: Placed
    links: tuple[Identifier, ...] = ()
    uptime: float = Field(default=1.0, ge=0.0, le=1.0)
    """Expected share of valid time."""
    least_days: NonNegative = 0.0
    """Days that it gets in any case."""
    most_days: Positive | None = None
    """Days that it gets at most."""

    @property
    def places(self) -> tuple[Placed, Placed]:
        """Numerator and denominator."""
        return self.numerator, self.denominator

    @model_validator(mode="after")
    def _least_below_most(self) -> Candidate:
        if self.most_days is not None and self.least_days > self.most_days:
            message = f"least_days {self.least_days:g} exceeds most_days {self.most_days:g}"
            raise ValueError(message)
        return self


class Plan(Table):
    """`[plan]`: how the days of the candidates are to be spent."""

    days: Positive | None = None
    """Days of all candidates' sessions together."""
    step: Positive = 1.0
    """Sessions last whole multiples of so many days."""
    start: Instant | None = None
    """When the first candidate may start, if the planned sessions are over by then; they go one
    after the other."""
    move_days: NonNegative = 1.0
    """Days that moving and setting up a clock takes."""
    criterion: Literal["targets", "A", "D", "E"] = "targets"
    """What is made small: the worst ratio of u to its target, or trace, determinant or largest
    eigenvalue of the covariance of the sites' numbers."""
    no_uncontrolled_tie: bool = False
    """Whether no site may hang on one session alone."""
    least_control: float = Field(default=0.1, gt=0.0, lt=0.5)
    """With `no_uncontrolled_tie`: share of the time across any cut of the net that must remain
    when the longest session across it is lost."""
    costs: Costs = Costs()
    alternatives: OtherTechniques = OtherTechniques()
