"""The tables of a level page on what its results have in common: correlations and closed loops."""

from __future__ import annotations

from collections.abc import Iterator

from clockgeo.campaign.results import CorrelationResult, LevelResult
from clockgeo.levelling.closures import signed_names
from clockgeo.report.numbers import rounded, typeset
from clockgeo.report.sheets import Cell, Sheet, measured, plain, words

__all__ = ["closure_sheet", "correlation_sheets"]

_MOST_PAIRS = 200
_MOST_CAUSES = 4
_SHOWS = 5e-5
"""Parts of a coefficient below this would be written as zero."""
_KINDS = {
    "session": "means of two sessions",
    "geopotential_number": "numbers (and heights) of two sites",
    "difference": "two differences",
}

Columns = list[tuple[str, str | tuple[str, str]]]


def correlation_sheets(result: LevelResult) -> Iterator[Sheet]:
    """Coefficients with their causes, one sheet a kind of quantity; the largest pairs first."""
    for kind, of_what in _KINDS.items():
        every = [one for one in result.correlations if one.kind == kind]
        if not every:
            continue
        shown = sorted(every, key=lambda one: -abs(one.coefficient))[:_MOST_PAIRS]
        caption = f"Correlation coefficients of {of_what}, and what they come from"
        if len(shown) < len(every):
            caption += f"; the {len(shown)} largest of {len(every)}, all in correlations.csv"
        name = f"correlated-{kind.replace('_', '-')}"
        yield Sheet.of(name, caption, _COLUMNS, _rows(shown), heads=2)


_COLUMNS: Columns = [
    ("first", "first"),
    ("second", "second"),
    ("correlation", "correlation (1)"),
    ("its parts", "parts"),
]


def _rows(shown: list[CorrelationResult]) -> list[tuple[Cell, ...]]:
    return [
        (
            words(one.first),
            words(one.second),
            plain(f"{one.coefficient:+.4f}", one.coefficient),
            words(_parts(one)),
        )
        for one in shown
    ]


def _parts(one: CorrelationResult) -> str:
    """The causes that show with their parts of the coefficient, the largest first."""
    shown = {cause: part for cause, part in one.parts.items() if abs(part) >= _SHOWS}
    ordered = sorted(shown.items(), key=lambda part: -abs(part[1]))
    written = [f"{cause} {typeset(f'{part:+.4f}')}" for cause, part in ordered[:_MOST_CAUSES]]
    rest = [part for _, part in ordered[_MOST_CAUSES:]]
    if rest:
        written.append(f"{len(rest)} more {typeset(f'{sum(rest):+.4f}')}")
    return "; ".join(written)


def closure_sheet(result: LevelResult) -> Sheet:
    """Closed loops of clock sessions."""
    columns: Columns = [
        ("sessions", "sessions"),
        ("misclosure / m² s⁻²", ("misclosure (m2 s-2)", "u (m2 s-2)")),
        ("in u", "normalised (1)"),
        ("verdict", "verdict"),
    ]
    rows = [
        (
            words(signed_names(one.sessions, one.signs)),
            measured(one.misclosure, one.u),
            plain("" if one.normalised is None else rounded(one.normalised), one.normalised),
            words(one.verdict),
        )
        for one in result.closures
    ]
    return Sheet.of("closures", "Closed loops of clocks; u with all shared effects", columns, rows)
