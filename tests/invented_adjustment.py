"""An invented adjustment's result, for pictures and pages."""

from __future__ import annotations

import numpy as np

from clockgeo.campaign.adjust_results import (
    AdjustResult,
    BlunderResult,
    ComponentResult,
    DatumResult,
    Epsg1046Result,
    GeoidResult,
    GlobalTest,
    IdentifiabilityResult,
    LoopResult,
    ObservationResult,
    ParameterShare,
    PointResult,
    RobustResult,
    SuspectResult,
)
from invented_result import invented_result

__all__ = ["invented_adjustment"]

_PLANE = Epsg1046Result(
    latitude=46.9,
    longitude=11.4,
    vertical_offset=-0.132,
    inclination_in_latitude=0.052,
    inclination_in_longitude=-0.018,
    largest_departure=2e-4,
    wkt="COORDINATEOPERATION[]",
)


def _datum(name: str, offset: float | None, *, tilted: bool) -> DatumResult:
    known = offset is not None
    return DatumResult(
        id=name,
        name=f"{name} datum",
        kind="normal",
        points=12,
        offset=offset,
        u=0.018 if known else None,
        offset_potential=9.8 * offset if known else None,
        u_offset_potential=0.18 if known else None,
        offset_above_height_reference=offset,
        tilt_north=2.5e-7 if tilted else 0.0,
        tilt_east=-0.9e-7 if tilted else 0.0,
        u_tilt_north=0.4e-7 if tilted else 0.0,
        u_tilt_east=0.4e-7 if tilted else 0.0,
        elevation_term=None,
        u_elevation_term=None,
        distance_term=None,
        u_distance_term=None,
        origin_latitude=46.9,
        origin_longitude=11.4,
        origin_gravity=9.806,
        epsg_1046=_PLANE if tilted else None,
    )


def _observation(name: str, kind: str, group: str, points: tuple[str, ...], **options: object):
    values = {
        "value": 12.3,
        "u": 0.05,
        "residual": 0.02,
        "standardised": 0.6,
        "redundancy": 0.55,
        "minimal_detectable_bias": 0.28,
        "external_reliability": 3.1,
        "largest_effect": 0.11,
        "largest_effect_on": points[-1],
    }
    return ObservationResult(
        id=name, kind=kind, group=group, points=points, **{**values, **options}
    )


def _observations(points: list[str]) -> tuple[ObservationResult, ...]:
    rng = np.random.default_rng(5)
    lines = [
        _observation(
            f"line {n}",
            "levelled",
            "first order",
            (points[n], points[n + 1]),
            residual=float(0.03 * w),
            standardised=float(w),
            redundancy=0.2 + 0.6 * n / len(points),
        )
        for n, w in enumerate(rng.standard_normal(len(points) - 1))
    ]
    lines[7] = _observation(
        "line 7",
        "levelled",
        "first order",
        (points[7], points[8]),
        residual=0.31,
        standardised=6.2,
    )
    published = [
        _observation(f"inland {p}", "published", "inland", (p,), residual=float(0.1 * w))
        for p, w in zip(points[:12], rng.standard_normal(12), strict=True)
    ]
    tie = _observation(
        "island tie",
        "levelled",
        "first order",
        (points[0], points[-1]),
        standardised=None,
        redundancy=0.0,
        minimal_detectable_bias=None,
        external_reliability=None,
        largest_effect=None,
        largest_effect_on=None,
    )
    return (*lines, *published, tie)


def invented_adjustment(*, name: str = "Four datums and nine clocks") -> AdjustResult:
    """A whole result; the numbers are invented and only have the right size."""
    level = invented_result()
    rng = np.random.default_rng(4)
    spots = [(46.5 + rng.uniform(0.0, 0.8), 10.8 + rng.uniform(0.0, 1.4)) for _ in range(30)]
    points = [
        PointResult(
            id=f"p{n}",
            latitude=latitude,
            longitude=longitude,
            geopotential_number=6000.0 + 40.0 * n if n < 28 else None,
            u=0.2 if n < 28 else None,
            normal_height=612.0 + 4.1 * n if n < 28 else None,
        )
        for n, (latitude, longitude) in enumerate(spots)
    ]
    points += [
        PointResult(
            id=site.id,
            latitude=site.latitude,
            longitude=site.longitude,
            geopotential_number=site.geopotential_number,
            u=site.u,
            normal_height=site.geopotential_number / 9.8,
        )
        for site in level.sites
    ]
    level = level.model_copy(update={"name": name})
    shared = [field for field in type(level).model_fields if field in AdjustResult.model_fields]
    shared.remove("schema_name")
    return AdjustResult(
        **{field: getattr(level, field) for field in shared},
        zero_definition="the known number of harbel",
        points=tuple(points),
        pairs=(),
        datums=(
            _datum("inland", -0.132, tilted=True),
            _datum("north coast", 0.42, tilted=False),
            _datum("island", None, tilted=False),
        ),
        geoid_models=(
            GeoidResult(
                id="saddle_quasigeoid.nc",
                bias=0.031,
                u=0.012,
                tilt_north=None,
                tilt_east=None,
                u_tilt_north=None,
                u_tilt_east=None,
            ),
        ),
        observations=_observations([p.id for p in points]),
        variance_factor=1.38,
        global_test=GlobalTest(
            chi_squared=58.0,
            degrees_of_freedom=42,
            p_value=0.051,
            lower=0.62,
            upper=1.47,
            passed=True,
        ),
        variance_components=(
            ComponentResult(
                group="first order", observations=32, factor=1.3, u=0.4, redundancy=20.1
            ),
        ),
        identifiability=IdentifiabilityResult(
            unknowns=41,
            rank=40,
            gaps=("datum island: offset not estimable; no clock or tie reaches it",),
            uncontrolled=("island tie",),
            shares=(
                ParameterShare(
                    parameter="inland offset", estimable=True, prior_share=0.1, data_share=0.9
                ),
            ),
        ),
        blunders=BlunderResult(
            limit=3.29,
            suspects=(
                SuspectResult(
                    id="line 7", bias=0.42, u=0.07, standardised=6.2, alternatives=("line 8",)
                ),
            ),
            chi_squared=30.0,
            degrees_of_freedom=41,
            p_value=0.9,
            text="One observation is suspected of a blunder: line 7.",
        ),
        loops=(
            LoopResult(
                observations=("line 7", "line 8"),
                signs=(1, -1),
                misclosure=0.4,
                u=0.07,
                standardised=5.7,
            ),
        ),
        robust=RobustResult(
            rule="bounded influence",
            scale=1.1,
            down_weighted={"line 7": 0.24},
            largest_change=0.09,
            at_point="p8",
        ),
    )
