"""The tables of a level page, from a result to sheets."""

from __future__ import annotations

from collections.abc import Iterator

from clockgeo.campaign.adjust_results import AdjustResult
from clockgeo.campaign.results import LevelResult, Quantity
from clockgeo.planning.results import PlanResult
from clockgeo.report.numbers import duration, percentage, rounded, with_uncertainty
from clockgeo.report.pictures.stability import in_words
from clockgeo.report.sheets import Cell, Sheet, count, measured, plain, words

__all__ = [
    "Solved",
    "budget_pairs",
    "budget_sheets",
    "comparison_sheet",
    "convention_sheet",
    "covariance_sheet",
    "difference_sheet",
    "input_sheet",
    "mean_sheet",
    "noise_sheet",
    "screening_sheet",
    "session_sheet",
    "site_sheet",
]

Solved = LevelResult | AdjustResult
"""Results that hold sites, sessions and differences."""

_ATTO = 1e-18


def site_sheet(result: Solved) -> Sheet:
    """Geopotential numbers and heights."""

    def height(quantity: Quantity | None) -> Cell:
        return measured(quantity.value, quantity.u) if quantity else measured(None, None)

    columns: list[tuple[str, str | tuple[str, str]]] = [
        ("site", "site"),
        ("latitude / °", "latitude (deg)"),
        ("longitude / °", "longitude (deg)"),
        (
            "geopotential number C / m² s⁻²",
            ("geopotential_number (m2 s-2)", "u_geopotential_number (m2 s-2)"),
        ),
    ]
    columns += [
        (f"{kind} height / m", (f"{kind}_height (m)", f"u_{kind}_height (m)"))
        for kind in ("normal", "orthometric", "dynamic")
    ]
    rows = [
        (
            words(site.name if site.name == site.id else f"{site.name} ({site.id})"),
            plain(f"{site.latitude:.5f}", site.latitude),
            plain(f"{site.longitude:.5f}", site.longitude),
            measured(site.geopotential_number, site.u),
            height(site.heights.normal),
            height(site.heights.orthometric),
            height(site.heights.dynamic),
        )
        for site in result.sites
    ]
    return Sheet.of("sites", "Geopotential numbers and heights of the markers", columns, rows)


def difference_sheet(result: Solved) -> Sheet:
    """Differences of all pairs."""
    columns: list[tuple[str, str | tuple[str, str]]] = [
        ("from", "from"),
        ("to", "to"),
        ("ΔC / m² s⁻²", ("geopotential_difference (m2 s-2)", "u (m2 s-2)")),
        ("Δ normal height / m", ("height_difference (m)", "u_height_difference (m)")),
        ("degrees of freedom", "degrees_of_freedom"),
        ("k for 95 %", "coverage_factor_95"),
    ]
    rows = [
        (
            words(d.from_site),
            words(d.to_site),
            measured(d.geopotential_difference, d.u),
            measured(d.height_difference, d.u_height_difference),
            plain(rounded(d.degrees_of_freedom, 3), d.degrees_of_freedom)
            if d.degrees_of_freedom is not None
            else Cell("∞", (None,)),
            plain(f"{d.coverage_factor_95:.2f}", d.coverage_factor_95),
        )
        for d in result.differences
    ]
    return Sheet.of("differences", "Differences, second site minus first", columns, rows, heads=2)


def session_sheet(result: Solved) -> Sheet:
    """Who was compared with whom, and when."""
    columns: list[tuple[str, str | tuple[str, str]]] = [
        ("session", "session"),
        ("numerator", "numerator"),
        ("denominator", "denominator"),
        ("start (UTC)", "start (UTC)"),
        ("length", "span (s)"),
        ("uptime", "uptime (1)"),
        ("valid", "valid (s)"),
        ("interval / s", "interval (s)"),
    ]
    rows = [
        (
            words(s.id),
            words(f"{s.numerator_clock} at {s.numerator_site}"),
            words(f"{s.denominator_clock} at {s.denominator_site}"),
            words(s.start.replace("T", "\u00a0")[:16]),
            plain(duration(s.span_seconds), s.span_seconds),
            plain(percentage(s.uptime), s.uptime),
            plain(duration(s.valid_seconds), s.valid_seconds),
            plain(f"{s.interval:.6g}", s.interval),
        )
        for s in result.sessions
    ]
    return Sheet.of("sessions", "Sessions", columns, rows)


def mean_sheet(result: Solved) -> Sheet:
    """Means of all sessions."""
    columns: list[tuple[str, str | tuple[str, str]]] = [
        ("session", "session"),
        ("y / 10⁻¹⁸", ("y (1)", "u (1)")),
        ("u statistical / 10⁻¹⁸", "u_statistical (1)"),
        ("u systematic / 10⁻¹⁸", "u_systematic (1)"),
        ("u scatter / 10⁻¹⁸", "u_scatter (1)"),
        ("corrections / 10⁻¹⁸", "correction (1)"),
        ("tide / 10⁻¹⁸", ("tide_correction (1)", "u_tide_correction (1)")),
        ("residual / 10⁻¹⁸", "residual (1)"),
    ]
    rows = [
        (
            words(s.id),
            measured(s.y, s.u, step=_ATTO),
            plain(f"{s.u_statistical / _ATTO:.2f}", s.u_statistical),
            plain(f"{s.u_systematic / _ATTO:.2f}", s.u_systematic),
            plain(f"{s.u_scatter / _ATTO:.2f}", s.u_scatter),
            plain(f"{s.correction / _ATTO:.1f}", s.correction),
            measured(s.tide_correction, s.u_tide_correction, step=_ATTO),
            plain(f"{s.residual / _ATTO:.2f}", s.residual),
        )
        for s in result.sessions
    ]
    return Sheet.of("means", "Means of the sessions after all corrections", columns, rows)


def screening_sheet(result: Solved) -> Sheet:
    """What does not count, and what difference it makes."""
    reasons = list(dict.fromkeys(reason for s in result.sessions for reason in s.flagged))
    columns: list[tuple[str, str | tuple[str, str]]] = [("session", "session")]
    columns += [(reason.replace("_", " "), f"{reason} (epochs)") for reason in reasons]
    columns += [
        ("y with screening / 10⁻¹⁸", ("y (1)", "u_statistical (1)")),
        ("y without / 10⁻¹⁸", "y_without_screening (1)"),
        ("difference / 10⁻¹⁸", "difference (1)"),
    ]
    rows = [
        (
            words(s.id),
            *(count(s.flagged.get(reason, 0)) for reason in reasons),
            measured(s.y, s.u_statistical, step=_ATTO),
            plain(f"{s.y_without_screening / _ATTO:.2f}", s.y_without_screening),
            plain(f"{(s.y - s.y_without_screening) / _ATTO:+.2f}", s.y - s.y_without_screening),
        )
        for s in result.sessions
    ]
    caption = "Epochs that do not count, by reason, and the mean with and without screening"
    return Sheet.of("screening", caption, columns, rows)


def noise_sheet(result: Solved) -> Sheet:
    """Noise models."""
    levels = ("white_pm", "flicker_pm", "white_fm", "flicker_fm", "random_walk_fm", "drift")
    units = {"drift": "s-1"}
    columns: list[tuple[str, str | tuple[str, str]]] = [("clocks", "clocks"), ("source", "source")]
    for level in levels:
        unit = units.get(level, "1")
        header = in_words(level) + (" / s⁻¹" if level in units else "")
        columns.append((header, f"{level} ({unit})"))
    rows = [
        (
            words(n.pair),
            words(n.source),
            *(plain(rounded(getattr(n, level), 3), getattr(n, level)) for level in levels),
        )
        for n in result.noise
    ]
    caption = "Noise models: Allan deviation at 1 s, or the floor; an absent noise is a dash"
    return Sheet.of("noise", caption, columns, rows, heads=1)


def budget_pairs(result: Solved) -> list[tuple[str, str]]:
    """Pairs whose budgets the page shows: those with the reference site, or all without one."""
    pairs = list(dict.fromkeys((line.from_site, line.to_site) for line in result.effects))
    reference = result.conventions.reference_site
    return [pair for pair in pairs if reference in pair] or pairs


def budget_sheets(result: Solved) -> Iterator[tuple[tuple[str, str], Sheet]]:
    """One budget a pair with the reference site."""
    for number, pair in enumerate(budget_pairs(result), start=1):
        lines = [e for e in result.effects if (e.from_site, e.to_site) == pair]
        columns: list[tuple[str, str | tuple[str, str]]] = [
            ("cause", "cause"),
            ("kind", "kind"),
            ("u(y) / 10⁻¹⁸", "u_y (1)"),
            ("u(C) / m² s⁻²", "u_potential (m2 s-2)"),
            ("u(height) / mm", "u_height (mm)"),
        ]
        rows = [
            (
                words(line.effect),
                words(line.kind),
                plain(rounded(line.y / _ATTO), line.y),
                plain(rounded(line.potential), line.potential),
                plain(rounded(line.height_mm), line.height_mm),
            )
            for line in lines
        ]
        caption = f"Parts of the standard uncertainty, {pair[0]} to {pair[1]}; squares add up"
        yield pair, Sheet.of(f"budget-{number}", caption, columns, rows)


def covariance_sheet(result: Solved) -> Sheet:
    """Covariance of the geopotential numbers."""
    order = result.covariance.order
    columns: list[tuple[str, str | tuple[str, str]]] = [("site", "site")]
    columns += [(name, f"{name} (m4 s-4)") for name in order]
    rows = [
        (words(name), *(plain(rounded(value, 4), value) for value in row))
        for name, row in zip(order, result.covariance.matrix, strict=True)
    ]
    caption = "Covariance of the geopotential numbers / m⁴ s⁻⁴"
    return Sheet.of("covariance", caption, columns, rows)


def comparison_sheet(result: LevelResult) -> Sheet:
    """Clocks against geodesy."""
    columns: list[tuple[str, str | tuple[str, str]]] = [
        ("from", "from"),
        ("to", "to"),
        ("clocks / m² s⁻²", ("clock (m2 s-2)", "u_clock (m2 s-2)")),
        ("geodesy / m² s⁻²", ("geodetic (m2 s-2)", "u_geodetic (m2 s-2)")),
        ("clocks − geodesy / m² s⁻²", ("difference (m2 s-2)", "u (m2 s-2)")),
        ("difference in u", "normalised_error (1)"),
        ("source", "source"),
    ]
    rows = [
        (
            words(c.from_site),
            words(c.to_site),
            measured(c.clock, c.u_clock),
            measured(c.geodetic, c.u_geodetic),
            measured(c.difference, c.u),
            plain(f"{c.normalised_error:+.2f}", c.normalised_error),
            words(c.source),
        )
        for c in result.comparison
    ]
    return Sheet.of("comparison", "Clocks against geodesy", columns, rows, heads=2)


def convention_sheet(result: Solved | PlanResult) -> Sheet:
    """Conventions and constants."""
    from clockgeo.constants import SPEED_OF_LIGHT

    c = result.conventions
    zero = f"{c.zero_level}, W0 = {with_uncertainty(c.w0, None, 'm² s⁻²')}"
    entries = [
        ("sign", c.sign),
        ("zero level", zero),
        ("tide system", c.tide_system.value),
        ("time-variable tide", c.tide.replace("_", " ")),
        ("ellipsoid", c.ellipsoid),
        ("reference site", c.reference_site),
        ("uncertainties", "standard uncertainties (k = 1), in brackets for the last digits"),
        ("times", "UTC; elapsed time is counted in TAI"),
        ("speed of light", f"{with_uncertainty(SPEED_OF_LIGHT.value, 0.0, 'm/s')} (exact)"),
        ("10⁻¹⁸ of frequency", "0.089 876 m² s⁻² of potential, about 9.2 mm of height"),
    ]
    return _two_columns("conventions", "Conventions and constants", "convention", entries)


def input_sheet(result: Solved | PlanResult) -> Sheet:
    """Inputs with checksums."""
    entries = [(one.path, one.sha256) for one in result.provenance.inputs]
    return _two_columns("inputs", "Files that were read", "file", entries, second="SHA-256")


def _two_columns(
    id: str,  # noqa: A002
    caption: str,
    first: str,
    entries: list[tuple[str, str]],
    *,
    second: str = "value",
) -> Sheet:
    rows = [(words(name), words(value)) for name, value in entries]
    return Sheet.of(id, caption, [(first, first), (second, second)], rows)
