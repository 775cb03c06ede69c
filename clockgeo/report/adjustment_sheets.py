"""The tables of an adjust page, from a result to sheets."""

from __future__ import annotations

from clockgeo.campaign.adjust_results import AdjustResult, ObservationResult
from clockgeo.levelling.closures import signed_names
from clockgeo.report.numbers import rounded
from clockgeo.report.sheets import Cell, Sheet, count, measured, plain, words

__all__ = [
    "component_sheet",
    "datum_sheet",
    "geoid_sheet",
    "loop_sheet",
    "observation_sheet",
    "parametric_sheet",
    "point_sheet",
    "robust_sheet",
    "share_sheet",
    "suspect_sheet",
]

Columns = list[tuple[str, str | tuple[str, str]]]

MOST_ROWS = 60
"""Longer tables show their first rows; result.json holds all."""
_PER_KM = 1e-6
"""One mm a km, as m a metre."""
_UNDETERMINED = "not determined"


def _determined(value: float | None, u: float | None, *, step: float = 1.0) -> Cell:
    """A value with its u, or the words that the data do not determine it."""
    if value is None or u is None:
        return Cell(_UNDETERMINED, (None, None))
    return measured(value, u, step=step)


def _tilt(value: float | None, u: float | None) -> Cell:
    """A tilt in mm/km; one that is not estimated is held at zero, and so it says."""
    if value == 0.0 and u == 0.0:
        return Cell("held at 0", (value, u))
    return _determined(value, u, step=_PER_KM)


def datum_sheet(result: AdjustResult) -> Sheet:
    """Offsets and tilts of the datums."""
    columns: Columns = [
        ("datum", "datum"),
        ("heights", "kind"),
        ("points", "points"),
        ("offset / m", ("offset (m)", "u_offset (m)")),
        ("offset / m² s⁻²", ("offset_potential (m2 s-2)", "u_offset_potential (m2 s-2)")),
        ("tilt north / mm km⁻¹", ("tilt_north (1)", "u_tilt_north (1)")),
        ("tilt east / mm km⁻¹", ("tilt_east (1)", "u_tilt_east (1)")),
        ("above the height reference / m", "offset_above_height_reference (m)"),
    ]
    rows = [
        (
            words(d.name or d.id),
            words(d.kind),
            count(d.points),
            _determined(d.offset, d.u),
            _determined(d.offset_potential, d.u_offset_potential),
            _tilt(d.tilt_north, d.u_tilt_north),
            _tilt(d.tilt_east, d.u_tilt_east),
            _beside(d.offset_above_height_reference, d.u),
        )
        for d in result.datums
    ]
    caption = "Datums against the zero level of the campaign; tilts from each datum's origin"
    return Sheet.of("datums", caption, columns, rows)


def _beside(value: float | None, u: float | None) -> Cell:
    """A value whose u is that of another column, which CSV does not repeat."""
    return Cell(_determined(value, u).text, (value,))


def parametric_sheet(result: AdjustResult) -> Sheet:
    """The datums' planes as EPSG coordinate operation method 1046."""
    columns: Columns = [
        ("datum", "datum"),
        ("latitude of the origin / °", "latitude (deg)"),
        ("longitude of the origin / °", "longitude (deg)"),
        ("vertical offset / m", "vertical_offset (m)"),
        ("inclination in latitude / ″", "inclination_in_latitude (arcsec)"),
        ("inclination in longitude / ″", "inclination_in_longitude (arcsec)"),
        ("largest departure / mm", "largest_departure (m)"),
    ]
    rows = [
        (
            words(d.name or d.id),
            plain(f"{plane.latitude:.6f}", plane.latitude),
            plain(f"{plane.longitude:.6f}", plane.longitude),
            plain(f"{plane.vertical_offset:.4f}", plane.vertical_offset),
            plain(f"{plane.inclination_in_latitude:.5f}", plane.inclination_in_latitude),
            plain(f"{plane.inclination_in_longitude:.5f}", plane.inclination_in_longitude),
            plain(rounded(1e3 * plane.largest_departure), plane.largest_departure),
        )
        for d in result.datums
        if (plane := d.epsg_1046) is not None
    ]
    caption = "The planes as EPSG coordinate operation method 1046; WKT2 stands in result.json"
    return Sheet.of("epsg-1046", caption, columns, rows)


def geoid_sheet(result: AdjustResult) -> Sheet:
    """Bias and tilts of the geoid model."""
    columns: Columns = [
        ("model", "model"),
        ("bias / m", ("bias (m)", "u_bias (m)")),
        ("tilt north / mm km⁻¹", ("tilt_north (1)", "u_tilt_north (1)")),
        ("tilt east / mm km⁻¹", ("tilt_east (1)", "u_tilt_east (1)")),
    ]
    rows = [
        (
            words(g.id),
            _determined(g.bias, g.u),
            _tilt(g.tilt_north, g.u_tilt_north),
            _tilt(g.tilt_east, g.u_tilt_east),
        )
        for g in result.geoid_models
    ]
    return Sheet.of("geoid-models", "Geoid models against the clocks and datums", columns, rows)


def point_sheet(result: AdjustResult) -> Sheet:
    """Adjusted points."""
    columns: Columns = [
        ("point", "point"),
        ("latitude / °", "latitude (deg)"),
        ("longitude / °", "longitude (deg)"),
        (
            "geopotential number C / m² s⁻²",
            ("geopotential_number (m2 s-2)", "u_geopotential_number (m2 s-2)"),
        ),
        ("normal height / m", "normal_height (m)"),
    ]
    rows = [
        (
            words(p.id),
            plain(f"{p.latitude:.5f}", p.latitude),
            plain(f"{p.longitude:.5f}", p.longitude),
            _determined(p.geopotential_number, p.u),
            plain("" if p.normal_height is None else f"{p.normal_height:.4f}", p.normal_height),
        )
        for p in result.points[:MOST_ROWS]
    ]
    caption = "Adjusted points" + _of_all(len(rows), len(result.points))
    return Sheet.of("points", caption, columns, rows)


def _of_all(shown: int, there: int) -> str:
    return f" ({shown} of {there}; all in result.json)" if shown < there else ""


def _worst_first(observation: ObservationResult) -> float:
    return -abs(observation.standardised or 0.0)


def observation_sheet(result: AdjustResult) -> Sheet:
    """Observations that fit worst, and how well each is controlled."""
    columns: Columns = [
        ("observation", "observation"),
        ("kind", "kind"),
        ("between", "points"),
        ("observed / m² s⁻²", ("value (m2 s-2)", "u (m2 s-2)")),
        ("residual / m² s⁻²", "residual (m2 s-2)"),
        ("standardised", "standardised (1)"),
        ("redundancy", "redundancy (1)"),
        ("minimal detectable bias / m² s⁻²", "minimal_detectable_bias (m2 s-2)"),
        ("its largest effect / m² s⁻²", "largest_effect (m2 s-2)"),
        ("on", "largest_effect_on"),
    ]
    rows = [
        (
            words(o.id),
            words(o.kind.replace("_", " ")),
            words(" – ".join(o.points)),
            measured(o.value, o.u),
            plain(rounded(o.residual, 3), o.residual),
            Cell("uncontrolled", (None,))
            if o.standardised is None
            else plain(f"{o.standardised:+.2f}", o.standardised),
            plain(f"{o.redundancy:.2f}", o.redundancy),
            Cell("∞", (None,))
            if o.minimal_detectable_bias is None
            else plain(rounded(o.minimal_detectable_bias), o.minimal_detectable_bias),
            plain(rounded(o.largest_effect), o.largest_effect),
            words(o.largest_effect_on or ""),
        )
        for o in sorted(result.observations, key=_worst_first)[:MOST_ROWS]
    ]
    caption = "Observations, largest standardised residual first"
    caption += _of_all(len(rows), len(result.observations))
    return Sheet.of("observations", caption, columns, rows)


def suspect_sheet(result: AdjustResult) -> Sheet:
    """Suspected blunders."""
    columns: Columns = [
        ("observation", "observation"),
        ("estimated blunder / m² s⁻²", ("bias (m2 s-2)", "u (m2 s-2)")),
        ("standardised", "standardised (1)"),
        ("could as well be", "alternatives"),
    ]
    rows = [
        (
            words(s.id),
            measured(s.bias, s.u),
            plain(f"{s.standardised:+.2f}", s.standardised),
            words(", ".join(s.alternatives)),
        )
        for s in result.blunders.suspects
    ]
    return Sheet.of("suspects", "Observations suspected of a blunder", columns, rows)


def loop_sheet(result: AdjustResult) -> Sheet:
    """Loops that close worst."""
    columns: Columns = [
        ("loop", "loop"),
        ("misclosure / m² s⁻²", ("misclosure (m2 s-2)", "u (m2 s-2)")),
        ("standardised", "standardised (1)"),
    ]
    rows = [
        (
            words(signed_names(loop.observations, loop.signs)),
            measured(loop.misclosure, loop.u),
            plain(f"{loop.standardised:+.2f}", loop.standardised),
        )
        for loop in result.loops[:MOST_ROWS]
    ]
    return Sheet.of("loops", "Loops of levelled lines that close worst", columns, rows)


def component_sheet(result: AdjustResult) -> Sheet:
    """Factors on the variances of groups."""
    columns: Columns = [
        ("group", "group"),
        ("observations", "observations"),
        ("redundancy", "redundancy (1)"),
        ("variance factor", ("factor (1)", "u_factor (1)")),
    ]
    rows = [
        (
            words(c.group),
            count(c.observations),
            plain(f"{c.redundancy:.1f}", c.redundancy),
            measured(c.factor, c.u),
        )
        for c in result.variance_components
    ]
    caption = "Variance of each group against its statement; 1 where the stated u holds"
    return Sheet.of("components", caption, columns, rows)


def share_sheet(result: AdjustResult) -> Sheet:
    """What parameters owe to prior knowledge and to data."""
    columns: Columns = [
        ("parameter", "parameter"),
        ("determined", "estimable"),
        ("owed to prior knowledge", "prior_share (1)"),
        ("owed to data", "data_share (1)"),
    ]
    rows = [
        (
            words(s.parameter),
            words("yes" if s.estimable else "no"),
            plain(f"{100 * s.prior_share:.0f} %", s.prior_share),
            plain(f"{100 * s.data_share:.0f} %", s.data_share),
        )
        for s in result.identifiability.shares[:MOST_ROWS]
    ]
    return Sheet.of("shares", "What the parameters rest on", columns, rows)


def robust_sheet(result: AdjustResult) -> Sheet:
    """Observations that the robust adjustment trusts less."""
    lowered = result.robust.down_weighted if result.robust else {}
    columns: Columns = [("observation", "observation"), ("factor of its weight", "factor (1)")]
    ordered = sorted(lowered.items(), key=lambda pair: pair[1])[:MOST_ROWS]
    rows = [(words(name), plain(f"{factor:.3f}", factor)) for name, factor in ordered]
    caption = "Observations that a robust adjustment trusts less" + _of_all(len(rows), len(lowered))
    return Sheet.of("robust", caption, columns, rows)
