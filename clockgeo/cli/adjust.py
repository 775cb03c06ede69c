"""`clockgeo adjust`: one adjustment of clocks, levelling, published heights and GNSS heights."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from clockgeo.cli.options import FigureKind, Figures, Force, Json, OutFolder, Quiet, Verbose

if TYPE_CHECKING:
    from clockgeo.campaign import AdjustResult

Campaign = Annotated[Path, typer.Argument(help="Campaign document (TOML) with network tables.")]
Without = Annotated[
    list[str] | None,
    typer.Option("--without", help="Leave out this observation or session; may be repeated."),
]
Skip = Annotated[
    bool, typer.Option("--skip-bad-rows", help="Leave out record rows that cannot be read.")
]
_SHOWN = 12


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
    """Reconcile height datums with clocks, levelling and GNSS/geoid.

    Everything that speaks of the same potential goes into one adjustment: offsets and tilts of the
    datums, what cannot be estimated in words, residuals and blunders. Writes result.json,
    result.nc, points.geojson, points.csv, a WKT2 file a datum and report.html into --out.

    Example: clockgeo adjust examples/four-datums/campaign.toml --out results/four-datums
    """
    from clockgeo.campaign import adjust, adjust_files, read_document, write_adjusted
    from clockgeo.cli.results import ResultPlace
    from clockgeo.cli.terminal import print_json, progress_shown, say
    from clockgeo.report import adjust_page

    document = read_document(campaign)
    datums = [datum.id for datum in document.campaign.datums]
    place = ResultPlace.prepared(
        out, adjust_files(datums), figures=figures, kind=figure_kind, replace=force
    )
    with progress_shown(quiet=quiet or json):
        adjusted = adjust(document, without=without or (), skip_bad_rows=skip_bad_rows)
        page = adjust_page(adjusted.result)
        written = write_adjusted(adjusted.result, place.folder, replace=force)
        written += place.write_page(page)
    if json:
        print_json(adjusted.result)
    elif not quiet:
        _tell(adjusted.result, verbose=verbose)
        for path in written:
            say(f"written: {path}")


def _tell(result: AdjustResult, *, verbose: bool) -> None:
    """Print the datums, what cannot be told, the tests and the suspects."""
    from clockgeo.cli.terminal import say

    conventions = result.conventions
    say(result.name)
    say(
        f"zero level: {conventions.zero_level}, tide system: {conventions.tide_system.value}; "
        f"it hangs on {result.zero_definition}\n"
    )
    if result.datums:
        _tell_datums(result)
    for gap in result.identifiability.gaps:
        say(f"not determined: {gap}")
    _tell_tests(result)
    if verbose:
        _tell_observations(result)
    for note in result.notes:
        say(f"note: {note}")
    say(conventions.caution)


def _tell_datums(result: AdjustResult) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.report.numbers import in_units_of, with_uncertainty

    def tilt(value: float | None, u: float | None) -> str:
        if value is None or u is None:
            return "not determined"
        return in_units_of(value, 1e-8, u) if u else "not asked for"

    show_table(
        "Datums: offset in m, tilts in cm on 1000 km",
        ["datum", "points", "offset", "tilt north", "tilt east"],
        [
            (
                one.name,
                str(one.points),
                "not determined"
                if one.offset is None or one.u is None
                else with_uncertainty(one.offset, one.u),
                tilt(one.tilt_north, one.u_tilt_north),
                tilt(one.tilt_east, one.u_tilt_east),
            )
            for one in result.datums
        ],
    )
    say("a positive offset: the datum's zero surface lies high\n")


def _tell_tests(result: AdjustResult) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.network.identifiability import listed

    test = result.global_test
    verdict = {True: "passed", False: "failed", None: "not possible"}[test.passed]
    factor = ""
    if result.variance_factor is not None:
        factor = f", variance factor {result.variance_factor:.3f}"
    say(
        f"{len(result.points)} points, {len(result.observations)} observations, "
        f"{test.degrees_of_freedom} degrees of freedom; global test {verdict}{factor}"
    )
    say(f"blunders: {result.blunders.text}")
    if result.identifiability.uncontrolled:
        names = listed(result.identifiability.uncontrolled)
        say(f"uncontrolled, nothing else checks them: {names}")
    if result.variance_components:
        show_table(
            "Variance factors of the groups",
            ["group", "observations", "factor", "u"],
            [
                (one.group, str(one.observations), f"{one.factor:.2f}", f"{one.u:.2f}")
                for one in result.variance_components
            ],
        )


def _tell_observations(result: AdjustResult) -> None:
    from clockgeo.cli.terminal import show_table

    def shown(value: float | None, digits: int = 3) -> str:
        return "none" if value is None else f"{value:.{digits}f}"

    worst = sorted(result.observations, key=lambda one: -abs(one.standardised or 0.0))[:_SHOWN]
    show_table(
        "Largest standardised residuals (m² s⁻²)",
        ["observation", "kind", "residual", "standardised", "redundancy", "detectable bias"],
        [
            (
                one.id,
                one.kind,
                f"{one.residual:.4f}",
                shown(one.standardised, 2),
                f"{one.redundancy:.2f}",
                shown(one.minimal_detectable_bias),
            )
            for one in worst
        ],
        left=2,
    )
