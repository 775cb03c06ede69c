"""From session means to rows of the linear model: signs, transfers to the marker, shared effects.

For the numerator clock n at site B and the denominator clock d at site A the row reads, in m² s⁻²,

    c² y - (t_B - t_A) = C_B - C_A + c² r + loads · z + noise,

where t leads from the marker's number to what the atoms feel (the height of the atoms, and the
permanent tide where the document's tide system is not the mean-tide system of averaged clock
data), r is the error of the nominal ratio of two different transitions, and the loads are those of
`effects.loading_of`.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.gravity import (
    TideSystem,
    marker_to_atoms,
    normal_gravity,
    tide_system_shift,
    uplift_difference,
)
from clockgeo.levelling.effects import EffectKey, loading_of
from clockgeo.levelling.linear_model import ModelBuilder
from clockgeo.levelling.redshift import potential_from_shift
from clockgeo.levelling.stations import Clock, Link, Site

__all__ = [
    "SITE_TRANSFER",
    "TIDE",
    "NumberOf",
    "RatioError",
    "RatioPrior",
    "SessionMean",
    "add_known_number",
    "add_session_rows",
    "ratio_of",
    "same_expectation",
    "stays_of",
    "systematic_loads",
    "transfer_difference",
]

TIDE = "tide model"
SITE_TRANSFER = "marker to atoms"
UPLIFT = "uplift rate"
_U_UNMEASURED_GRAVITY = 2e-3
"""m s⁻²: what normal gravity may be off at a place where gravity was not measured (200 mGal)."""


@dataclass(frozen=True)
class SessionMean:
    """What one session says, before any solution.

    Attributes
    ----------
    id : str
    numerator, denominator : Clock
    numerator_site, denominator_site : Site
    links : tuple of Link
    start_ns : int
        Start in TAI nanoseconds; orders the stays of a clock.
    y : float
        Mean fractional frequency with all corrections applied.
    u_tide : float
        Standard uncertainty of the session's tide correction; its phase is unknown, so it is a
        variable of the session's own.
    years : float
        Time from the epoch of the geopotential numbers to the session, a; 0 without an epoch.
    """

    id: str
    numerator: Clock
    numerator_site: Site
    denominator: Clock
    denominator_site: Site
    links: tuple[Link, ...]
    start_ns: int
    y: float
    u_tide: float = 0.0
    years: float = 0.0


@dataclass(frozen=True)
class RatioPrior:
    """Prior knowledge of a nominal ratio: standard uncertainty `u`, fractional."""

    u: float


@dataclass(frozen=True)
class NumberOf:
    """Name of an unknown: the geopotential number of a site's marker."""

    site: str

    def __str__(self) -> str:
        return f"geopotential number of {self.site}"


@dataclass(frozen=True)
class RatioError:
    """Name of an unknown: the error of the nominal ratio of two transitions, in c² y."""

    first: str
    second: str

    def __str__(self) -> str:
        return f"error of the nominal ratio {self.first}/{self.second}"

    @classmethod
    def between(cls, first: str, second: str) -> RatioError:
        """Return the one name for both directions of a ratio."""
        return cls(*sorted((first, second)))


def ratio_of(numerator: Clock, denominator: Clock) -> tuple[RatioError, float] | None:
    """Name and sign of the nominal-ratio error between two clocks; None for one species.

    To first order the error of B/A is minus that of A/B, so both share one unknown.
    """
    n, d = numerator.species, denominator.species
    if n == d:
        return None
    return RatioError.between(n, d), 1.0 if n < d else -1.0


def stays_of(means: Sequence[SessionMean]) -> dict[tuple[str, str], str]:
    """Name the stay of each clock in each session: (clock, session) -> stay.

    A stay lasts from a clock's first session at a site to its first session elsewhere; coming
    back begins a new stay.
    """
    stays: dict[tuple[str, str], str] = {}
    last: dict[str, tuple[str, int]] = {}
    for mean in sorted(means, key=lambda m: (m.start_ns, m.id)):
        for clock, site in (
            (mean.numerator, mean.numerator_site),
            (mean.denominator, mean.denominator_site),
        ):
            place, count = last.get(clock.id, ("", 0))
            last[clock.id] = (site.id, count + (place != site.id))
            stays[clock.id, mean.id] = f"stay {last[clock.id][1]} at {site.id}"
    return stays


def systematic_loads(
    mean: SessionMean, stays: Mapping[tuple[str, str], str]
) -> dict[Hashable, float]:
    """All effects that act on a session, with sign, in m² s⁻² (clocks, links, tide, transfer)."""
    loads: dict[Hashable, float] = {}
    owners: list[tuple[Clock | Link, float]] = [
        (mean.numerator, 1.0),
        (mean.denominator, -1.0),
        *((link, 1.0) for link in mean.links),
    ]
    for owner, sign in owners:
        stay = stays.get((owner.id, mean.id), "")
        parts = loading_of(owner.effects, owner=owner.id, stay=stay, session=mean.id, sign=sign)
        for key, load in parts.items():
            loads[key] = loads.get(key, 0.0) + potential_from_shift(load)
    if mean.u_tide:
        loads[EffectKey("solid Earth", TIDE, mean.id)] = potential_from_shift(mean.u_tide)
    for clock, site, sign in _placed(mean):
        for key, load in _transfer_loads(site, clock, mean.years).items():
            loads[key] = loads.get(key, 0.0) + sign * load
    return {key: load for key, load in loads.items() if load}


def same_expectation(means: Sequence[SessionMean]) -> list[int]:
    """Number the sessions by what they measure; those that can differ by noise alone share one.

    Such sessions have the same clocks at the same sites (either way round) and the same effects,
    so that no stay or session has one of its own; tides are corrected and count as alike.
    """
    stays = stays_of(means)
    numbers: dict[tuple[Hashable, ...], int] = {}
    found = []
    for mean in means:
        numerator = (mean.numerator.id, mean.numerator_site.id)
        denominator = (mean.denominator.id, mean.denominator_site.id)
        sign = 1.0 if numerator <= denominator else -1.0
        loads = {
            (key, sign * load)
            for key, load in systematic_loads(replace(mean, u_tide=0.0), stays).items()
        }
        found.append(
            numbers.setdefault(
                (frozenset((numerator, denominator)), frozenset(loads)), len(numbers)
            )
        )
    return found


def _placed(mean: SessionMean) -> tuple[tuple[Clock, Site, float], tuple[Clock, Site, float]]:
    return (
        (mean.numerator, mean.numerator_site, 1.0),
        (mean.denominator, mean.denominator_site, -1.0),
    )


def _gravity(site: Site) -> tuple[float, float]:
    """Gravity at the marker and its u; normal gravity where it was not measured."""
    if site.gravity is not None:
        return site.gravity, site.u_gravity
    return float(
        normal_gravity(site.latitude, site.ellipsoidal_height or 0.0)
    ), _U_UNMEASURED_GRAVITY


def transfer_difference(mean: SessionMean, tide_system: TideSystem) -> float:
    """What the clocks feel beyond the difference of the markers' numbers, in m² s⁻².

    Parameters
    ----------
    mean : SessionMean
        Which clocks stand where.
    tide_system : TideSystem
        Tide system of the markers' geopotential numbers.

    Returns
    -------
    float
        Numerator minus denominator of: height of the atoms above the marker, plus the uplift of
        the marker since the epoch, plus the step from `tide_system` to the mean-tide system of
        averaged clock data.
    """
    return sum(
        sign * _transfer(site, clock, tide_system, mean.years)
        for clock, site, sign in _placed(mean)
    )


def _transfer(site: Site, clock: Clock, tide_system: TideSystem, years: float) -> float:
    gravity, _ = _gravity(site)
    rise = site.atoms_height(clock.id)
    to_atoms = marker_to_atoms(rise, gravity=gravity, gradient=site.gravity_gradient)
    to_mean_tide = tide_system_shift(
        "geopotential_number", site.latitude, source=tide_system, target=TideSystem.MEAN_TIDE
    )
    uplift = uplift_difference(site.uplift_rate, years, gravity=gravity)
    return to_atoms.geopotential_difference + uplift + float(to_mean_tide)


def _transfer_loads(site: Site, clock: Clock, years: float) -> dict[EffectKey, float]:
    gravity, u_gravity = _gravity(site)
    return {
        EffectKey(site.id, UPLIFT): uplift_difference(site.u_uplift_rate, years, gravity=gravity),
        EffectKey(clock.id, f"{SITE_TRANSFER}, height", site.id): gravity
        * site.u_atoms_above_marker,
        EffectKey(site.id, f"{SITE_TRANSFER}, gravity"): site.atoms_height(clock.id) * u_gravity,
    }


def add_session_rows(
    builder: ModelBuilder,
    means: Sequence[SessionMean],
    covariance: ArrayLike,
    *,
    tide_system: TideSystem,
    ratios: Mapping[RatioError, RatioPrior] | None = None,
) -> NDArray[np.float64]:
    """Add one row per session, with the statistical covariance of all of them.

    Parameters
    ----------
    builder : ModelBuilder
        Where the rows go.
    means : sequence of SessionMean, length K
        What was measured.
    covariance : array, shape (K, K)
        Statistical covariance of the means, in fractional frequency squared.
    tide_system : TideSystem
        Tide system of the markers' geopotential numbers.
    ratios : mapping, optional
        Prior knowledge of nominal ratios by the name `ratio_of` gives them; a ratio without an
        entry is unknown and estimated.

    Returns
    -------
    float array, shape (K,)
        Systematic standard uncertainty of each session alone, in m² s⁻².
    """
    priors = dict(ratios or {})
    stays = stays_of(means)
    systematic = np.zeros(len(means))
    for place, mean in enumerate(means):
        loads = systematic_loads(mean, stays)
        on: dict[Hashable, float] = {}
        ratio = ratio_of(mean.numerator, mean.denominator)
        if ratio is not None:
            name, sign = ratio
            if name in priors:
                key = EffectKey(name.first, f"nominal ratio to {name.second}")
                loads[key] = potential_from_shift(sign * priors[name].u)
            else:
                on[name] = sign
        value = potential_from_shift(mean.y)
        for _, site, sign in _placed(mean):
            on[NumberOf(site.id)] = on.get(NumberOf(site.id), 0.0) + sign
        value -= transfer_difference(mean, tide_system)
        builder.observe(mean.id, kind="clock", value=value, on=on, effects=loads)
        systematic[place] = float(np.sqrt(sum(load**2 for load in loads.values())))
    scale = potential_from_shift(1.0) ** 2
    builder.correlate([mean.id for mean in means], np.asarray(covariance) * scale)
    return systematic


def add_known_number(builder: ModelBuilder, site: str, value: float, u: float) -> None:
    """Take the geopotential number of a site as known: `value` with standard uncertainty `u`."""
    builder.observe(
        f"known number of {site}",
        kind="known",
        value=value,
        on={NumberOf(site): 1.0},
        variance=u**2,
    )
