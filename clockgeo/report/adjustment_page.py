"""The page of `adjust`: datums first, then what was observed, what fits and what cannot be told."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from clockgeo.campaign.adjust_results import AdjustResult, DatumResult
from clockgeo.report import adjustment_sheets as sheets
from clockgeo.report.adjustment_pictures import (
    datum_pictures,
    net_pictures,
    observation_pictures,
    offset_words,
    plane_pictures,
)
from clockgeo.report.levelling_page import budget_section, difference_answers, said, session_section
from clockgeo.report.levelling_sheets import (
    convention_sheet,
    difference_sheet,
    input_sheet,
    site_sheet,
)
from clockgeo.report.numbers import in_units_of, rounded, typeset, with_uncertainty
from clockgeo.report.page import Answer, Page, Section, write_page

__all__ = ["adjust_page", "write_adjust_page"]

_ANSWERS = 8


def write_adjust_page(path: str | Path, result: AdjustResult, *, replace: bool = False) -> Path:
    """Write the page of an adjustment as one self-contained HTML file.

    Parameters
    ----------
    path : path
        Where to.
    result : AdjustResult
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    OutputError
        If the file cannot be written, or exists and `replace` is false.
    """
    return write_page(path, adjust_page(result), replace=replace)


def adjust_page(result: AdjustResult) -> Page:
    """Put an adjustment together as a page."""
    parts = [
        (len(result.datums), "datum"),
        (len(result.points), "point"),
        (len(result.sessions), "clock session"),
        (len(result.observations), "observation"),
    ]
    told = ", ".join(f"{n} {name}{'' if n == 1 else 's'}" for n, name in parts if n)
    return Page(
        title=result.name,
        kind="Height datums reconciled",
        summary=told,
        answers=tuple(_answers(result)),
        sections=tuple(_sections(result)),
        caution=result.conventions.caution,
        version=result.provenance.version,
    )


def _answers(result: AdjustResult) -> Iterator[Answer]:
    for place, datum in enumerate(result.datums[:_ANSWERS]):
        yield Answer(
            what=datum.name or datum.id,
            value=offset_words(datum),
            also=(*_also(datum), *((_conventions(result),) if place == 0 else ())),
        )
    if not result.datums:
        yield from difference_answers(result)
    yield Answer(
        what="Does everything fit together?",
        value=_fit_word(result),
        also=(_fit_words(result),),
        verdict=result.blunders.text,
    )


def _also(datum: DatumResult) -> Iterator[str]:
    tilts = [
        f"{typeset(in_units_of(tilt, 1e-6, u, 'mm/km'))} {way}"
        for tilt, u, way in (
            (datum.tilt_north, datum.u_tilt_north, "north"),
            (datum.tilt_east, datum.u_tilt_east, "east"),
        )
        if tilt is not None and u
    ]
    heights = f"{said(datum.kind).capitalize()} heights of {datum.points} points"
    yield f"{heights}; tilt {', '.join(tilts)}." if tilts else f"{heights}."
    if datum.offset_above_height_reference is not None and datum.u is not None:
        height = with_uncertainty(datum.offset_above_height_reference, datum.u, "m")
        yield f"Above the zero level of the height reference: {typeset(height)}."


def _conventions(result: AdjustResult) -> str:
    conventions = result.conventions
    return (
        f"Zero level: {said(conventions.zero_level)}; tide system: "
        f"{said(conventions.tide_system.value)}; standard uncertainties (k = 1)."
    )


def _fit_word(result: AdjustResult) -> str:
    test = result.global_test
    if test.passed is None:
        return "cannot be said: nothing is observed twice"
    suspects = len(result.blunders.suspects)
    but = f", but {suspects} suspected of a blunder" if suspects else ""
    return f"yes{but}" if test.passed else f"no{but.replace('but', 'with')}"


def _fit_words(result: AdjustResult) -> str:
    test = result.global_test
    if test.passed is None or result.variance_factor is None:
        return "There are as many unknowns as observations."
    p = "" if test.p_value is None else f", p = {rounded(test.p_value)}"
    limits = ""
    if test.lower is not None and test.upper is not None:
        limits = f" (95 % limits {rounded(test.lower, 3)} to {rounded(test.upper, 3)})"
    return (
        f"Variance factor {rounded(result.variance_factor, 3)}{limits}: chi-squared "
        f"{rounded(test.chi_squared, 4)} with {test.degrees_of_freedom} degrees of freedom{p}."
    )


def _sections(result: AdjustResult) -> Iterator[Section]:
    if result.datums:
        yield Section(
            "datums",
            "Datums",
            parts=(
                *datum_pictures(result),
                sheets.datum_sheet(result),
                *plane_pictures(result),
                *([sheets.parametric_sheet(result)] if _any_plane(result) else []),
            ),
        )
    yield Section(
        "network",
        "Network",
        paragraphs=(f"Zero of the numbers: {result.zero_definition}.",),
        parts=(
            *net_pictures(result),
            *([sheets.point_sheet(result)] if result.points else []),
            *([site_sheet(result), difference_sheet(result)] if result.sites else []),
            *([sheets.geoid_sheet(result)] if result.geoid_models else []),
        ),
        notes=result.notes,
    )
    if result.sessions:
        yield session_section(result)
    if result.effects:
        yield budget_section(result)
    yield _observations(result)
    yield _limits_of_data(result)
    yield Section("conventions", "Conventions and constants", parts=(convention_sheet(result),))
    yield Section("inputs", "Inputs", parts=(input_sheet(result),))


def _any_plane(result: AdjustResult) -> bool:
    return any(datum.epsg_1046 is not None for datum in result.datums)


def _observations(result: AdjustResult) -> Section:
    optional = (
        (result.blunders.suspects, sheets.suspect_sheet),
        (result.loops, sheets.loop_sheet),
        (result.variance_components, sheets.component_sheet),
        (result.robust and result.robust.down_weighted, sheets.robust_sheet),
    )
    paragraphs = [result.blunders.text]
    if result.robust is not None:
        change = rounded(result.robust.largest_change)
        paragraphs.append(
            f"A robust adjustment ({result.robust.rule}) moves no number by more than {change} "
            f"m² s⁻² (at {result.robust.at_point})."
        )
    return Section(
        "fit",
        "Observations: residuals and reliability",
        paragraphs=tuple(paragraphs),
        parts=(
            *observation_pictures(result),
            sheets.observation_sheet(result),
            *(make(result) for there, make in optional if there),
        ),
    )


def _limits_of_data(result: AdjustResult) -> Section:
    found = result.identifiability
    gaps = found.gaps or ("Everything that was asked for is determined by the data.",)
    loose = ", ".join(found.uncontrolled[: sheets.MOST_ROWS])
    uncontrolled = f"Observed once only, so that nothing would show an error: {loose}."
    return Section(
        "limits",
        "What the data cannot tell",
        paragraphs=(f"{found.unknowns} unknowns, of which {found.rank} are determined.",),
        parts=(sheets.share_sheet(result),) if found.shares else (),
        notes=(*gaps, uncontrolled) if loose else tuple(gaps),
    )
