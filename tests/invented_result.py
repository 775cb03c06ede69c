"""An invented campaign's result and evidence, for pictures and pages."""

from __future__ import annotations

import numpy as np

from clockgeo.campaign.evidence import Evidence, GroupEvidence, RecordEvidence
from clockgeo.campaign.results import (
    Comparison,
    Conventions,
    CovarianceTable,
    DifferenceResult,
    EffectLine,
    FitResult,
    Heights,
    Input,
    LevelResult,
    NoiseResult,
    Provenance,
    Quantity,
    ScatterResult,
    SessionResult,
    SiteResult,
)
from clockgeo.frequency import NoiseModel, TickSeries
from clockgeo.gravity import CAUTION
from clockgeo.times import iso_utc, tai_from_iso

__all__ = ["invented_evidence", "invented_record", "invented_result"]

INTERVAL = 3.7
_SESSIONS = (
    ("local 1", "harbel", "2027-05-03T07:00:00Z", 10.0, 0.68),
    ("local 2", "harbel", "2027-05-04T07:00:00Z", 10.0, 0.74),
    ("saddle 1", "kesselin", "2027-05-06T06:00:00Z", 12.0, 0.55),
    ("saddle 2", "kesselin", "2027-05-07T06:00:00Z", 12.0, 0.61),
    ("saddle 3", "kesselin", "2027-05-08T06:00:00Z", 12.0, 0.47),
    ("local 3", "harbel", "2027-05-10T07:00:00Z", 10.0, 0.71),
)


def invented_record(
    name: str = "local 1",
    start: str = "2027-05-03T07:00:00Z",
    hours: float = 10.0,
    *,
    interval: float = INTERVAL,
    seed: int = 1,
    level: float = 1.5e-13,
) -> RecordEvidence:
    """A record with gaps, outliers, cycle slips and a mask."""
    rng = np.random.default_rng(seed)
    count = int(hours * 3600.0 / interval)
    present = np.ones(count, dtype=bool)
    for first in rng.integers(0, count, 12):
        present[first : first + rng.integers(10, 400)] = False
    y = level + 9e-16 / interval**0.5 * rng.standard_normal(count)
    reasons = np.zeros(count, dtype=np.uint8)
    outliers = rng.integers(0, count, 12)
    y[outliers] += rng.choice([-1.0, 1.0], 12) * 9e-15
    reasons[outliers] = 4
    slips = rng.integers(0, count, 3)
    y[slips] += 3e-15
    reasons[slips] = 8
    reasons[count // 2 : count // 2 + count // 25] |= 16
    lost = rng.integers(0, count, 5)
    y[lost], reasons[lost] = np.nan, 1
    tai = tai_from_iso(start) + np.rint(np.arange(count) * interval * 1e9).astype(np.int64)
    return RecordEvidence(name, tai[present], y[present], reasons[present], interval)


def invented_evidence() -> Evidence:
    """Records of all sessions and one noise group."""
    records = tuple(
        invented_record(name, start, hours, seed=number, level=1.5e-13 * (site != "harbel"))
        for number, (name, site, start, hours, _) in enumerate(_SESSIONS)
    )
    series = tuple(
        TickSeries(
            np.rint(r.tai_ns[r.reasons == 0] / (INTERVAL * 1e9)).astype(np.int64),
            r.y[r.reasons == 0],
        )
        for r in records
    )
    group = GroupEvidence(
        name="anchor - wanderer, every 3.7 s",
        sessions=tuple(r.session for r in records),
        series=series,
        interval=INTERVAL,
        model=NoiseModel(white_fm=9.3e-16, flicker_fm=2.1e-18),
    )
    return Evidence(records=records, groups=(group,))


def _session(number: int, place: tuple[str, str, str, float, float]) -> SessionResult:
    name, site, start, hours, uptime = place
    first = tai_from_iso(start)
    return SessionResult(
        id=name,
        numerator_clock="wanderer",
        numerator_site=site,
        denominator_clock="anchor",
        denominator_site="harbel",
        start=start,
        stop=iso_utc(first + int(hours * 3.6e12)),
        y=1.5168e-13 * (site != "harbel") + (number - 2.5) * 1e-18,
        u_statistical=5.2e-18,
        u_systematic=8.4e-18,
        u_scatter=1.1e-18,
        u=9.9e-18,
        uptime=uptime,
        valid_seconds=3600.0 * hours * uptime,
        span_seconds=3600.0 * hours,
        interval=INTERVAL,
        correction=5.1e-15,
        tide_correction=3.1e-18 * (site != "harbel"),
        u_tide_correction=1.2e-19,
        flagged={"not_usable": 5, "outlier": 12, "cycle_slip": 3, "masked": 389},
        y_without_screening=1.5171e-13 * (site != "harbel"),
        residual=(number % 3 - 1) * 4e-18,
        notes=("stamps jitter by 0.043 s",) if number == 0 else (),
    )


def invented_result(
    *, name: str = "Kesselin Saddle from Harbel", site_name: str = "Kesselin Saddle"
) -> LevelResult:
    """A whole result; the numbers are invented and only have the right size."""
    pair = {"from_site": "harbel", "to_site": "kesselin"}
    parts = (
        ("noise of clocks and links", "statistics", 4.4e-18),
        ("excess scatter between sessions", "scatter", 1.1e-18),
        ("wanderer: black-body radiation, temperature (by stay)", "effect", 2.5e-18),
        ("wanderer: lattice light (by stay)", "effect", 2.2e-18),
        ("valley fibre: uncompensated ends", "effect", 3e-19),
        ("heights of the atoms", "geodetic", 6e-19),
    )
    u = 8.987551787e16 * sum(y**2 for _, _, y in parts) ** 0.5
    return LevelResult(
        name=name,
        conventions=Conventions(
            sign="positive y: the numerator clock is higher; C = W0 - W.",
            zero_level="height_reference",
            w0=62636853.4,
            tide_system="zero_tide",
            reference_site="harbel",
            tide="solid_earth",
            ellipsoid="grs80",
            caution=CAUTION,
        ),
        sessions=tuple(_session(number, place) for number, place in enumerate(_SESSIONS)),
        sites=tuple(
            SiteResult(
                id=site,
                name=words,
                latitude=latitude,
                longitude=longitude,
                geopotential_number=number,
                u=u_site,
                zero_level="height_reference",
                tide_system="zero_tide",
                heights=Heights(
                    normal=Quantity(value=number / 9.8, u=u_site / 9.8),
                    orthometric=Quantity(value=number / 9.8 - 0.05, u=u_site / 9.8),
                    dynamic=None,
                ),
            )
            for site, words, latitude, longitude, number, u_site in (
                ("harbel", "Harbel", 47.2, 11.1, 5501.9, 0.15),
                ("kesselin", site_name, 46.85, 11.95, 19132.62, 0.51),
            )
        ),
        differences=(
            DifferenceResult(
                **pair,
                geopotential_difference=13630.72,
                u=u,
                height_difference=1390.66,
                u_height_difference=u / 9.8,
                coverage_factor_95=2.07,
                degrees_of_freedom=23.4,
            ),
        ),
        covariance=CovarianceTable(
            order=("harbel", "kesselin"), matrix=((0.0225, 0.0225), (0.0225, 0.0225 + u**2))
        ),
        effects=tuple(
            EffectLine(
                **pair,
                effect=effect,
                kind=kind,
                y=y,
                potential=8.987551787e16 * y,
                height_mm=8.987551787e19 * y / 9.8,
            )
            for effect, kind, y in parts
        ),
        fit=FitResult(chi_squared=3.4, degrees_of_freedom=4, p_value=0.49),
        scatter=ScatterResult(
            standard_deviation=1.1e-18, lower=0.0, upper=8e-18, birge_ratio=0.92, applied=True
        ),
        noise=(
            NoiseResult(
                pair="anchor - wanderer, every 3.7 s",
                sessions=tuple(place[0] for place in _SESSIONS),
                white_pm=None,
                flicker_pm=None,
                white_fm=9.3e-16,
                flicker_fm=2.1e-18,
                random_walk_fm=None,
                drift=None,
                source="fitted",
            ),
        ),
        comparison=(
            Comparison(
                **pair,
                clock=13630.72,
                u_clock=u,
                geodetic=13630.95,
                u_geodetic=0.31,
                difference=-0.23,
                u=(u**2 + 0.31**2) ** 0.5,
                normalised_error=-0.23 / (u**2 + 0.31**2) ** 0.5,
                source="ellipsoidal heights and saddle_quasigeoid.nc",
            ),
        ),
        notes=("session local 4 has no record yet and was left out",),
        provenance=Provenance(
            version="0.1.0",
            inputs=(
                Input(path="campaign.toml", sha256="3f" * 32),
                Input(path="records/local-1.txt.gz", sha256="a1" * 32),
            ),
        ),
    )
