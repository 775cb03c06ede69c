"""`clockgeo level`: the main job, from a campaign's records to heights."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from clockgeo.cli.options import FigureKind, Figures, Force, Json, OutFolder, Quiet, Verbose

if TYPE_CHECKING:
    from clockgeo.campaign.results import LevelResult

Campaign = Annotated[Path, typer.Argument(help="Campaign document (TOML) with records.")]
Without = Annotated[
    list[str] | None, typer.Option("--without", help="Leave out this session; may be repeated.")
]
Skip = Annotated[
    bool, typer.Option("--skip-bad-rows", help="Leave out rows that cannot be read, and say so.")
]


def command(
    campaign: Campaign,
    out: OutFolder,
    without: Without = None,
    skip_bad_rows: Skip = False,
    figures: Figures = None,
    figure_kind: FigureKind = "png",
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
    verbose: Verbose = False,
) -> None:
    """Turn a campaign's records into potential differences and heights.

    Writes result.json, result.nc, correlations.csv and report.html into the folder given with
    --out, and the page's pictures as files into the folder given with --figures.

    Example: clockgeo level examples/saddle/campaign.toml --out results/saddle
    """
    from clockgeo.campaign import LEVEL_FILES, level, read_document, write_result
    from clockgeo.cli.results import ResultPlace
    from clockgeo.cli.terminal import print_json, progress_shown, say
    from clockgeo.report import level_page

    document = read_document(campaign)
    place = ResultPlace.prepared(out, LEVEL_FILES, figures=figures, kind=figure_kind, replace=force)
    with progress_shown(quiet=quiet or json):
        levelled = level(document, without=without or (), skip_bad_rows=skip_bad_rows)
        written = write_result(levelled.result, place.folder, replace=force)
        page = level_page(levelled.result, levelled.evidence)
        written += place.write_page(page)
    if json:
        print_json(levelled.result)
    elif not quiet:
        _tell(levelled.result, verbose=verbose)
        for path in written:
            say(f"written: {path}")


def _tell(result: LevelResult, *, verbose: bool) -> None:
    """Print the answer, the sessions, the comparison and, if asked, the whole budget."""
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.levelling.closures import signed_names
    from clockgeo.report.numbers import in_units_of, with_uncertainty

    conventions = result.conventions
    say(f"{result.name}")
    say(f"zero level: {conventions.zero_level}, tide system: {conventions.tide_system.value}\n")
    show_table(
        "Differences (second site minus first)",
        ["from", "to", "ΔC / m² s⁻²", "Δ normal height / m", "k for 95 %"],
        [
            (
                d.from_site,
                d.to_site,
                with_uncertainty(d.geopotential_difference, d.u),
                with_uncertainty(d.height_difference, d.u_height_difference),
                f"{d.coverage_factor_95:.2f}",
            )
            for d in result.differences
        ],
        left=2,
    )
    show_table(
        "Sessions (1e-18)",
        [
            "session",
            "y",
            "u stat.",
            "u syst.",
            "u scatter",
            "tide",
            "residual",
            "uptime",
            "flagged",
        ],
        [
            (
                s.id,
                in_units_of(s.y, 1e-18, s.u),
                f"{s.u_statistical * 1e18:.2f}",
                f"{s.u_systematic * 1e18:.2f}",
                f"{s.u_scatter * 1e18:.2f}",
                f"{s.tide_correction * 1e18:.2f}",
                f"{s.residual * 1e18:.2f}",
                f"{100 * s.uptime:.0f} %",
                str(sum(count for reason, count in s.flagged.items() if reason != "not_usable")),
            )
            for s in result.sessions
        ],
    )
    if verbose:
        show_table(
            "Budget",
            ["from", "to", "effect", "y / 1e-18", "m² s⁻²", "mm"],
            [
                (
                    line.from_site,
                    line.to_site,
                    line.effect,
                    f"{line.y * 1e18:.2f}",
                    f"{line.potential:.4f}",
                    f"{line.height_mm:.1f}",
                )
                for line in result.effects
            ],
            left=3,
        )
    if verbose and result.closures:
        show_table(
            "Closed loops of clocks (m² s⁻²)",
            ["sessions", "misclosure", "in u", "verdict"],
            [
                (
                    signed_names(one.sessions, one.signs),
                    with_uncertainty(one.misclosure, one.u) if one.u else "0",
                    "" if one.normalised is None else f"{one.normalised:+.2f}",
                    one.verdict,
                )
                for one in result.closures
            ],
        )
    if result.comparison:
        show_table(
            "Clocks against geodesy (m² s⁻²)",
            ["from", "to", "clocks", "geodesy", "difference", "in u", "source"],
            [
                (
                    c.from_site,
                    c.to_site,
                    with_uncertainty(c.clock, c.u_clock),
                    with_uncertainty(c.geodetic, c.u_geodetic),
                    with_uncertainty(c.difference, c.u),
                    f"{c.normalised_error:+.2f}",
                    c.source,
                )
                for c in result.comparison
            ],
            left=2,
        )
    for note in result.notes:
        say(f"note: {note}")
    say(conventions.caution)
