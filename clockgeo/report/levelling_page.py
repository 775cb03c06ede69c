"""The page of `level`: answer first, then everything needed to check it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path

from clockgeo.campaign.evidence import Evidence
from clockgeo.campaign.results import Comparison, DifferenceResult, LevelResult, SiteResult
from clockgeo.report import levelling_sheets as sheets
from clockgeo.report.correlation_sheets import closure_sheet, correlation_sheets
from clockgeo.report.levelling_pictures import (
    budget_pictures,
    campaign_map,
    campaign_timeline,
    comparison_pictures,
    correlation_pictures,
    record_pictures,
    residual_pictures,
    stability_pictures,
)
from clockgeo.report.levelling_sheets import Solved
from clockgeo.report.numbers import rounded, typeset, with_uncertainty
from clockgeo.report.page import Answer, Page, Section, write_page

__all__ = [
    "budget_section",
    "difference_answers",
    "level_page",
    "said",
    "session_section",
    "write_level_page",
]

_ANSWERS = 8
_AGREE, _DOUBTFUL = 2.0, 3.0
"""Differences up to so many standard uncertainties are called agreement, and doubtful."""
_SIGNIFICANT = 0.05
_OTHER_BUDGETS = "The budgets of the other pairs stand in result.json, under effects."
_USE_THE_COVARIANCE = (
    "Numbers of sites share the clocks, the links and the reference; use the covariance "
    "whenever they are combined."
)


def write_level_page(
    path: str | Path, result: LevelResult, evidence: Evidence, *, replace: bool = False
) -> Path:
    """Write the page of a level result as one self-contained HTML file.

    Parameters
    ----------
    path : path
        Where to.
    result : LevelResult
    evidence : Evidence
        Records and noise groups of the same run.
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    OutputError
        If the file cannot be written, or exists and `replace` is false.
    """
    return write_page(path, level_page(result, evidence), replace=replace)


def level_page(result: LevelResult, evidence: Evidence) -> Page:
    """Put a level result together as a page."""
    first, last = result.sessions[0], result.sessions[-1]
    period = f"{min(s.start for s in result.sessions)[:10]} to "
    period += max(s.stop for s in result.sessions)[:10]
    pairs = {f"{first.numerator_clock} against {first.denominator_clock}"}
    pairs.add(f"{last.numerator_clock} against {last.denominator_clock}")
    sessions = "1 session" if len(result.sessions) == 1 else f"{len(result.sessions)} sessions"
    return Page(
        title=result.name,
        kind="Heights from clocks",
        summary=f"{sessions}, {period} (UTC): {', '.join(sorted(pairs))}",
        answers=tuple(difference_answers(result, result.comparison)),
        sections=tuple(_sections(result, evidence)),
        caution=result.conventions.caution,
        version=result.provenance.version,
    )


def difference_answers(
    result: Solved, comparison: Sequence[Comparison] | None = None
) -> Iterator[Answer]:
    """Differences from the reference site, with the verdict of what they were compared with."""
    sites = {site.id: site for site in result.sites}
    reference = result.conventions.reference_site
    from_reference = [d for d in result.differences if d.from_site == reference]
    for difference in (from_reference or list(result.differences))[:_ANSWERS]:
        ends = difference.from_site, difference.to_site
        compared = [c for c in comparison or () if (c.from_site, c.to_site) == ends]
        site = sites[difference.to_site]
        number = with_uncertainty(difference.geopotential_difference, difference.u, "m² s⁻²")
        verdict = " ".join(_verdict(line) for line in compared)
        if comparison is not None and not compared:
            verdict = "There is no geodetic value to hold against it."
        yield Answer(
            what=f"{site.name} minus {sites[difference.from_site].name}",
            value=f"ΔC = {typeset(number)}",
            also=tuple(_also(difference, site)),
            verdict=verdict,
        )


def _also(difference: DifferenceResult, site: SiteResult) -> Iterator[str]:
    height = with_uncertainty(difference.height_difference, difference.u_height_difference, "m")
    half = difference.coverage_factor_95 * difference.u
    yield (
        f"Difference of normal heights {typeset(height)}. "
        f"95 % interval of ΔC: ± {rounded(half)} m² s⁻² (k = {difference.coverage_factor_95:.2f})."
    )
    number = typeset(with_uncertainty(site.geopotential_number, site.u, "m² s⁻²"))
    heights = [
        f"{kind} height {typeset(with_uncertainty(quantity.value, quantity.u, 'm'))}"
        for kind in ("normal", "orthometric", "dynamic")
        if (quantity := getattr(site.heights, kind)) is not None
    ]
    yield f"{site.name}: C = {number}; {', '.join(heights)}."
    yield (
        f"Zero level: {said(site.zero_level)}; tide system: {said(site.tide_system.value)}; "
        "standard uncertainties (k = 1)."
    )


def said(name: str) -> str:
    """Write a name of a convention as words."""
    return name.replace("_", " ")


def _verdict(line: Comparison) -> str:
    size = abs(line.normalised_error)
    difference = typeset(with_uncertainty(line.difference, line.u, "m² s⁻²"))
    word = "Disagrees with"
    if size <= _DOUBTFUL:
        word = "Fits doubtfully with"
    if size <= _AGREE:
        word = "Agrees with"
    return (
        f"{word} geodesy ({line.source}): clocks minus geodesy {difference}, "
        f"{size:.1f} times its standard uncertainty."
    )


def _sections(result: LevelResult, evidence: Evidence) -> Iterator[Section]:
    yield Section(
        "places",
        "Sites and campaign",
        parts=(
            campaign_map(result),
            sheets.site_sheet(result),
            sheets.difference_sheet(result),
            campaign_timeline(result),
            sheets.session_sheet(result),
            sheets.mean_sheet(result),
        ),
        notes=result.notes,
    )
    yield Section("records", "Records", parts=tuple(record_pictures(result, evidence)))
    yield Section(
        "screening",
        "Screening log",
        paragraphs=("Nothing is deleted: every epoch stays in its file, flagged with its reason.",),
        parts=(sheets.screening_sheet(result),),
        notes=tuple(f"{s.id}: {note}" for s in result.sessions for note in s.notes),
    )
    yield Section(
        "stability",
        "Stability",
        parts=(*stability_pictures(evidence), sheets.noise_sheet(result)),
    )
    yield budget_section(result)
    yield Section(
        "correlations",
        "Correlations",
        paragraphs=(_USE_THE_COVARIANCE,),
        parts=(
            *correlation_pictures(result),
            sheets.covariance_sheet(result),
            *correlation_sheets(result),
        ),
    )
    if result.comparison:
        yield Section(
            "comparison",
            "Clocks against geodesy",
            parts=(*comparison_pictures(result), sheets.comparison_sheet(result)),
        )
    yield Section(
        "fit",
        "Do the sessions agree?",
        paragraphs=tuple(_fit_words(result)),
        parts=(
            *residual_pictures(result),
            *([closure_sheet(result)] if result.closures else []),
        ),
    )
    yield Section(
        "conventions", "Conventions and constants", parts=(sheets.convention_sheet(result),)
    )
    yield Section("inputs", "Inputs", parts=(sheets.input_sheet(result),))


def session_section(result: Solved) -> Section:
    """Sessions of clocks where they are only a part of what was observed."""
    return Section(
        "sessions",
        "Clock sessions",
        parts=(
            campaign_timeline(result),
            sheets.session_sheet(result),
            sheets.mean_sheet(result),
            sheets.screening_sheet(result),
            sheets.noise_sheet(result),
            *residual_pictures(result),
        ),
        notes=tuple(f"{s.id}: {note}" for s in result.sessions for note in s.notes),
    )


def budget_section(result: Solved) -> Section:
    """What makes up the u of every difference."""
    budgets = dict(sheets.budget_sheets(result))
    every = {(line.from_site, line.to_site) for line in result.effects}
    return Section(
        "budget",
        "Uncertainty budget",
        paragraphs=(_OTHER_BUDGETS,) if len(every) > len(budgets) else (),
        parts=tuple(
            part for pair, picture in budget_pictures(result) for part in (picture, budgets[pair])
        ),
    )


def _fit_words(result: LevelResult) -> Iterator[str]:
    fit = result.fit
    if fit.degrees_of_freedom == 0 or fit.p_value is None:
        yield "There are as many unknowns as sessions: no session can be checked by the others."
    else:
        agree = "agree with each other" if fit.p_value >= _SIGNIFICANT else "do not agree well"
        yield (
            f"The session means {agree}: chi-squared {rounded(fit.chi_squared, 3)} with "
            f"{fit.degrees_of_freedom} degrees of freedom, p = {rounded(fit.p_value)}."
        )
    if result.scatter is not None:
        scatter = result.scatter
        upper = "no upper limit" if scatter.upper is None else typeset(rounded(scatter.upper))
        yield (
            f"Excess scatter between sessions {typeset(rounded(scatter.standard_deviation))} "
            f"(95 % interval {typeset(rounded(scatter.lower))} to {upper}); it is "
            f"{'part' if scatter.applied else 'not part'} of the stated uncertainties."
        )
