"""The tables of a plan's page, from a result to sheets."""

from __future__ import annotations

from collections.abc import Iterator

from clockgeo.planning.results import ConfirmationResult, OptimumResult, PlanResult
from clockgeo.report.numbers import percentage, rounded
from clockgeo.report.sheets import Cell, Sheet, count, plain, words

__all__ = [
    "alternative_sheet",
    "confirmation_sheet",
    "need_sheet",
    "sensitivity_sheets",
    "session_sheet",
    "share_sheet",
    "stay_sheet",
    "target_sheet",
    "term_sheet",
]

_ATTO = 1e-18
_CHANGES = 15

Columns = list[tuple[str, str | tuple[str, str]]]
_ENDS: Columns = [("from", "from"), ("to", "to")]


def _mm(metres: float) -> Cell:
    return plain(rounded(1e3 * metres, 3), metres)


def _factor(value: float | None) -> Cell:
    return plain(rounded(value, 3), value) if value is not None else Cell("none does", (None,))


def target_sheet(result: PlanResult) -> Sheet:
    """Targets and whether they are reached."""
    columns: Columns = [
        *_ENDS,
        ("kind", "kind"),
        ("wanted u / mm", "required_u (m)"),
        ("predicted u / mm", "predicted_u (m)"),
        ("with full uptime / mm", "full_uptime_u (m)"),
        ("with endless time / mm", "floor_u (m)"),
        ("reached", "reached"),
    ]
    rows = [
        (
            words(one.from_end),
            words(one.to_end),
            words(one.kind.replace("_", " ")),
            _mm(one.required_u),
            _mm(one.predicted_u),
            _mm(one.full_uptime_u),
            _mm(one.floor_u),
            words("yes" if one.reached else "no"),
        )
        for one in result.targets
    ]
    return Sheet.of("targets", "Targets", columns, rows, heads=2)


def need_sheet(result: PlanResult) -> Sheet:
    """Factors that would just reach each target, one at a time."""
    columns: Columns = [
        *_ENDS,
        ("all times ×", "time_factor"),
        ("white noise ×", "stability_factor"),
        ("all uptimes ×", "uptime_factor"),
        ("largest effect", "effect"),
        ("its u / 10⁻¹⁸", "effect_u (1)"),
        ("its u ×", "effect_factor"),
    ]
    rows = [
        (
            words(target.from_end),
            words(target.to_end),
            _factor(target.time_factor),
            _factor(target.stability_factor),
            _factor(target.uptime_factor),
            words(limit.effect or "none"),
            plain(
                "" if limit.effect_u is None else rounded(limit.effect_u / _ATTO), limit.effect_u
            ),
            _factor(limit.effect_factor),
        )
        for target, limit in zip(result.targets, result.limits, strict=True)
    ]
    caption = (
        "What would just reach each target, one change at a time; below 1 is less than planned"
    )
    return Sheet.of("needs", caption, columns, rows, heads=2)


def session_sheet(result: PlanResult) -> Sheet:
    """Planned sessions."""
    columns: Columns = [
        ("session", "session"),
        ("numerator", "numerator"),
        ("denominator", "denominator"),
        ("start (UTC)", "start (UTC)"),
        ("days", "days"),
        ("uptime", "uptime (1)"),
        ("u statistical / 10⁻¹⁸", "u_statistical (1)"),
        ("u systematic / 10⁻¹⁸", "u_systematic (1)"),
    ]
    rows = [
        (
            words(one.id),
            words(f"{one.numerator_clock} at {one.numerator_site}"),
            words(f"{one.denominator_clock} at {one.denominator_site}"),
            words(one.start.replace("T", "\u00a0")[:16]),
            plain(f"{one.days:.2f}", one.days),
            plain(percentage(one.uptime), one.uptime),
            plain(f"{one.u_statistical / _ATTO:.2f}", one.u_statistical),
            plain(f"{one.u_systematic / _ATTO:.2f}", one.u_systematic),
        )
        for one in result.sessions
    ]
    return Sheet.of("sessions", "Sessions; u of each alone", columns, rows)


def stay_sheet(result: PlanResult) -> Sheet:
    """Stays and moves of the clocks."""
    columns: Columns = [
        ("clock", "clock"),
        ("site", "site"),
        ("from (UTC)", "start (UTC)"),
        ("to (UTC)", "stop (UTC)"),
        ("way there / km", "distance (m)"),
    ]
    rows = [
        (
            words(one.clock),
            words(one.site),
            words(one.start.replace("T", "\u00a0")[:16]),
            words(one.stop.replace("T", "\u00a0")[:16]),
            plain(f"{one.distance / 1e3:.0f}", one.distance),
        )
        for one in result.stays
    ]
    return Sheet.of("stays", "Stays of the clocks", columns, rows, heads=2)


def term_sheet(result: PlanResult) -> Sheet:
    """Budgets of all targets by term."""
    columns: Columns = [
        *_ENDS,
        ("term", "term"),
        ("kind", "kind"),
        ("u(y) / 10⁻¹⁸", "u_y (1)"),
        ("u(C) / m² s⁻²", "u_potential (m2 s-2)"),
        ("u(height) / mm", "u_height (mm)"),
    ]
    rows = [
        (
            words(one.from_end),
            words(one.to_end),
            words(one.effect),
            words(one.kind),
            plain(rounded(one.y / _ATTO), one.y),
            plain(rounded(one.potential), one.potential),
            plain(rounded(one.height_mm), one.height_mm),
        )
        for one in result.terms
    ]
    return Sheet.of("terms", "Predicted u by term; squares add up", columns, rows, heads=3)


def share_sheet(optimum: OptimumResult) -> Sheet:
    """Days of all candidates."""
    columns: Columns = [
        ("candidate", "candidate"),
        ("optimal days", "optimal_days"),
        ("whole steps", "days"),
    ]
    rows = [
        (
            words(one.id),
            plain(f"{one.optimal_days:.2f}", one.optimal_days),
            plain(f"{one.days:g}", one.days),
        )
        for one in optimum.shares
    ]
    return Sheet.of("shares", "How the days are shared out", columns, rows)


def sensitivity_sheets(result: PlanResult) -> Iterator[Sheet]:
    """The changes that help each target most."""
    for number, target in enumerate(result.targets, start=1):
        ends = target.from_end, target.to_end
        lines = [one for one in result.sensitivity if (one.from_end, one.to_end) == ends]
        columns: Columns = [
            ("change", "change"),
            ("u / mm", "u (m)"),
            ("gain / mm", "gain (m)"),
        ]
        rows = [(words(one.change), _mm(one.u), _mm(one.gain)) for one in lines[:_CHANGES]]
        caption = f"What helps most, {ends[0]} to {ends[1]}, one change at a time"
        yield Sheet.of(f"changes-{number}", caption, columns, rows)


def alternative_sheet(result: PlanResult) -> Sheet:
    """Other techniques over the same distances."""
    columns: Columns = [
        *_ENDS,
        ("distance / km", "distance (m)"),
        ("clocks / mm", "u_clock (m)"),
        ("levelling / mm", "u_levelling (m)"),
        ("GNSS and geoid / mm", "u_gnss_geoid (m)"),
        ("break-even with levelling / km", "break_even_distance (m)"),
    ]
    rows = [
        (
            words(one.from_end),
            words(one.to_end),
            plain(f"{one.distance / 1e3:.1f}", one.distance),
            _mm(one.u_clock),
            _mm(one.u_levelling),
            _mm(one.u_gnss_geoid),
            Cell("none", (None,))
            if one.break_even_distance is None
            else plain(rounded(one.break_even_distance / 1e3, 3), one.break_even_distance),
        )
        for one in result.alternatives
    ]
    caption = "Standard uncertainty of the same differences by other techniques"
    return Sheet.of("techniques", caption, columns, rows, heads=2)


def confirmation_sheet(confirmation: ConfirmationResult) -> Sheet:
    """Predicted and realised scatter."""
    columns: Columns = [
        *_ENDS,
        ("campaigns", "runs"),
        ("predicted u / mm", "predicted_u (m)"),
        ("realised / mm", "realised_u (m)"),
        ("expected from / mm", "lower (m)"),
        ("expected to / mm", "upper (m)"),
        ("stated u, median / mm", "stated_u (m)"),
        ("agrees", "agrees"),
    ]
    rows = [
        (
            words(one.from_end),
            words(one.to_end),
            count(confirmation.runs),
            _mm(one.predicted_u),
            _mm(one.realised_u),
            _mm(one.lower),
            _mm(one.upper),
            _mm(one.stated_u),
            words("yes" if one.agrees else "no"),
        )
        for one in confirmation.targets
    ]
    caption = "Scatter of simulated campaigns about the truth; expected in 95 % of such simulations"
    return Sheet.of("confirmation", caption, columns, rows, heads=2)
