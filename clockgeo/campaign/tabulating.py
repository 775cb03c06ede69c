"""From a solution to the tables of the result: sites, differences, budget, covariance."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from clockgeo.campaign.results import (
    CovarianceTable,
    DifferenceResult,
    EffectLine,
    Heights,
    Quantity,
    SiteResult,
)
from clockgeo.campaign.schema import Campaign
from clockgeo.campaign.statistics import SessionStatistics
from clockgeo.gravity import heights_of
from clockgeo.gravity.zero_levels import zero_level
from clockgeo.levelling.redshift import potential_from_shift, shift_from_potential
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.levelling.solution import Combination, Solution

__all__ = [
    "budget",
    "covariance_of",
    "differences",
    "effective_freedom",
    "site_results",
    "site_pairs",
]


def effective_freedom(u: float, parts: Iterable[tuple[float, float]]) -> float:
    """Effective degrees of freedom of `u` after Welch and Satterthwaite (JCGM 100, G.4).

    Parameters
    ----------
    u : float
        The whole standard uncertainty.
    parts : iterable of (float, float)
        Parts that were estimated from data, each with its degrees of freedom; what is left of u
        counts as known.

    Returns
    -------
    float
        u⁴ / Σ (u_i⁴/ν_i); infinite where no part is uncertain.
    """
    doubt = sum(part**4 / freedom for part, freedom in parts if part > 0.0)
    return u**4 / doubt if doubt > 0.0 else float("inf")


def site_pairs(campaign: Campaign, solved: Sequence[str]) -> list[tuple[str, str]]:
    """Pairs to report: from the reference site to every other, then all the rest."""
    order = sorted(solved, key=lambda name: name != campaign.head.reference_site)
    return list(combinations(order, 2))


def site_results(campaign: Campaign, solution: Solution, solved: Sequence[str]) -> list[SiteResult]:
    """Geopotential number and heights of every solved site."""
    level = zero_level(campaign.head.zero_level)
    results = []
    for name in solved:
        site = campaign.site(name)
        number, u = solution.value({NumberOf(name): 1.0}), solution.u({NumberOf(name): 1.0})
        heights = heights_of(
            number,
            latitude=site.latitude,
            u=u,
            gravity=site.gravity,
            u_gravity=site.u_gravity,
        )
        by_kind = {kind.value: Quantity(value=h.value, u=h.u) for kind, h in heights.items()}
        results.append(
            SiteResult(
                id=name,
                name=site.label,
                latitude=site.latitude,
                longitude=site.longitude,
                geopotential_number=number,
                u=u,
                zero_level=level.name,
                tide_system=campaign.head.tide_system,
                heights=Heights(
                    normal=by_kind.get("normal"),
                    orthometric=by_kind.get("orthometric"),
                    dynamic=by_kind.get("dynamic"),
                ),
            )
        )
    return results


def _slopes(campaign: Campaign, numbers: Mapping[str, float]) -> dict[str, tuple[float, float]]:
    """Normal height of each site in m and its derivative with respect to C."""
    heights = {
        name: heights_of(number, latitude=campaign.site(name).latitude)
        for name, number in numbers.items()
    }
    normal = {
        name: next(h for k, h in all_.items() if k == "normal") for name, all_ in heights.items()
    }
    return {name: (height.value, height.per_potential) for name, height in normal.items()}


def differences(
    campaign: Campaign,
    solution: Solution,
    pairs: Sequence[tuple[str, str]],
    statistics: SessionStatistics | None,
) -> list[DifferenceResult]:
    """Potential and normal-height difference of every pair, second minus first."""
    names = {name for pair in pairs for name in pair}
    numbers = {name: solution.value({NumberOf(name): 1.0}) for name in sorted(names)}
    slopes = _slopes(campaign, numbers)
    results = []
    for first, second in pairs:
        combination = {NumberOf(second): 1.0, NumberOf(first): -1.0}
        u = solution.u(combination)
        (low, low_slope), (high, high_slope) = slopes[first], slopes[second]
        in_height = {NumberOf(second): high_slope, NumberOf(first): -low_slope}
        effective = float("inf")
        if statistics is not None:
            scatter, noise = statistical_parts(solution, combination, statistics.scatter_covariance)
            statistical = float(np.hypot(noise, scatter))
            effective = effective_freedom(u, [(statistical, statistics.freedom)])
        finite = effective if np.isfinite(effective) else 1e9
        results.append(
            DifferenceResult(
                from_site=first,
                to_site=second,
                geopotential_difference=solution.value(combination),
                u=u,
                height_difference=high - low,
                u_height_difference=solution.u(in_height),
                coverage_factor_95=float(stats.t.ppf(0.975, finite)),
                degrees_of_freedom=effective if np.isfinite(effective) else None,
            )
        )
    return results


def covariance_of(solution: Solution, solved: Sequence[str]) -> CovarianceTable:
    """Covariance of the sites' geopotential numbers."""
    weights = np.array([solution.weights({NumberOf(name): 1.0}) for name in solved])
    matrix = weights @ solution.covariance @ weights.T
    return CovarianceTable(
        order=tuple(solved), matrix=tuple(tuple(float(v) for v in row) for row in matrix)
    )


def statistical_parts(
    solution: Solution, combination: Combination, scatter: NDArray[np.float64] | None
) -> tuple[float, float]:
    """Parts of u from excess scatter and from noise, in m² s⁻².

    Parameters
    ----------
    solution : Solution
    combination : mapping
        Unknown -> coefficient.
    scatter : float array, shape (K, K), or None
        Excess scatter of the sessions that is part of the rows' noise, fractional squared.
    """
    weights = solution.weights(combination) @ solution.gain
    of_sessions = weights[np.array(solution.model.kinds) == "clock"]
    variance = 0.0 if scatter is None else float(of_sessions @ scatter @ of_sessions)
    of_scatter = potential_from_shift(max(variance, 0.0) ** 0.5)
    noise = solution.noise_u(combination, "clock") ** 2 - of_scatter**2
    return of_scatter, max(noise, 0.0) ** 0.5


def budget(
    campaign: Campaign,
    solution: Solution,
    pairs: Sequence[tuple[str, str]],
    scatter_covariance: NDArray[np.float64] | None,
) -> Iterator[EffectLine]:
    """Split the u of every pair by cause; the squares of the lines add up to u squared.

    Parameters
    ----------
    campaign, solution
        What was solved.
    pairs : sequence of (str, str)
        Which differences.
    scatter_covariance : float array, shape (K, K), or None
        Excess scatter of the sessions that is part of the rows' noise, fractional squared.
    """
    for first, second in pairs:
        combination = {NumberOf(second): 1.0, NumberOf(first): -1.0}
        gravity = campaign.site(second).gravity or 9.81
        scatter, noise = statistical_parts(solution, combination, scatter_covariance)
        lines = [
            ("noise of clocks and links", "statistics", noise),
            ("excess scatter between sessions", "scatter", scatter),
            (
                "known number of the reference site",
                "geodetic",
                solution.noise_u(combination, "known"),
            ),
        ]
        parts = [
            (str(part.effect), "effect", abs(part.u))
            for part in solution.contributions(combination)
        ]
        lines += sorted(parts, key=lambda line: -line[2])
        for name, kind, potential in lines:
            if potential > 1e-9 * solution.u(combination):
                yield EffectLine(
                    from_site=first,
                    to_site=second,
                    effect=name,
                    kind=kind,
                    y=shift_from_potential(potential),
                    potential=potential,
                    height_mm=1e3 * potential / gravity,
                )
