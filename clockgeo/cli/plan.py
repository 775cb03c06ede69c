"""`clockgeo plan`: what a campaign will reach, what limits it and what to change."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from clockgeo.cli.options import FigureKind, Figures, Force, Json, OutFolder, Quiet, Verbose

if TYPE_CHECKING:
    from clockgeo.planning.results import PlanResult

Campaign = Annotated[Path, typer.Argument(help="Campaign document (TOML) with a [target].")]

Confirm = Annotated[
    int, typer.Option("--confirm", min=0, help="Simulate so many campaigns and compare.")
]
Seed = Annotated[int, typer.Option("--seed", min=0, help="Of the simulated campaigns.")]


def _show_presets(name: str | None) -> None:
    """Print one preset as a table of the document, or the list of all, and stop."""
    if name is None:
        return
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.planning.presets import PRESETS, find_preset, preset_toml

    if name == "list":
        rows = [
            (one.name, one.kind, one.text, f"{one.u * 1e18:g}", one.source)
            for one in PRESETS.values()
        ]
        show_table("Presets", ["name", "kind", "what it is", "u / 1e-18", "source"], rows, left=3)
    else:
        say(preset_toml(find_preset(name)))
    raise typer.Exit


Preset = Annotated[
    str | None,
    typer.Option(
        "--preset",
        callback=_show_presets,
        is_eager=True,
        help='Print a published class of clock or link as TOML, or "list" them, and stop.',
    ),
]


def command(
    campaign: Campaign,
    out: OutFolder,
    preset: Preset = None,
    confirm: Confirm = 0,
    seed: Seed = 1,
    figures: Figures = None,
    figure_kind: FigureKind = "png",
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
    verbose: Verbose = False,
) -> None:
    """Predict what a planned campaign will reach, and how to reach more.

    Runs the model of level and adjust without data: predicted u by term, what limits it, the best
    use of the days of [[candidate]] sessions, other techniques. Writes plan.json, plan.nc,
    sessions.toml and report.html into the folder given with --out, and the page's pictures as
    files into the folder given with --figures. With --confirm, simulated campaigns show how their
    results scatter.

    Example: clockgeo plan examples/harrow-line/campaign.toml --out results/harrow-line
    """
    del preset  # acted upon before anything else
    from clockgeo.campaign import read_document
    from clockgeo.cli.results import ResultPlace
    from clockgeo.cli.terminal import print_json, progress_shown, say
    from clockgeo.planning import PLAN_FILES, plan, write_plan
    from clockgeo.report import plan_page

    document = read_document(campaign)
    place = ResultPlace.prepared(out, PLAN_FILES, figures=figures, kind=figure_kind, replace=force)
    with progress_shown(quiet=quiet or json):
        planned = plan(document, confirm_runs=confirm, seed=seed)
        page = plan_page(planned.result)
        written = write_plan(planned.result, planned.sessions, place.folder, replace=force)
        written += place.write_page(page)
    if json:
        print_json(planned.result)
    elif not quiet:
        _tell(planned.result, verbose=verbose)
        for path in written:
            say(f"written: {path}")


_GAINS = 6


def _tell(result: PlanResult, *, verbose: bool) -> None:
    """Print targets, limits, sessions, the best changes and the alternatives."""
    from clockgeo.cli.terminal import say, show_table

    say(result.name + "\n")
    show_table(
        "Targets (standard uncertainty, mm of height)",
        ["from", "to", "wanted", "predicted", "endless time", "reached"],
        [
            (
                one.from_end,
                one.to_end,
                f"{1e3 * one.required_u:.1f}",
                f"{1e3 * one.predicted_u:.1f}",
                f"{1e3 * one.floor_u:.1f}",
                "yes" if one.reached else "no",
            )
            for one in result.targets
        ],
        left=2,
    )
    for limit in result.limits:
        say(f"{limit.from_end} to {limit.to_end}: {limit.text}")
    say()
    show_table(
        "Sessions (u in 1e-18)",
        ["session", "start", "days", "uptime", "u stat.", "u syst."],
        [
            (
                one.id,
                one.start[:16],
                f"{one.days:.2f}",
                f"{100 * one.uptime:.0f} %",
                f"{one.u_statistical * 1e18:.2f}",
                f"{one.u_systematic * 1e18:.2f}",
            )
            for one in result.sessions
        ],
        left=2,
    )
    _tell_terms(result)
    _tell_changes(result, most=None if verbose else _GAINS)
    _tell_alternatives(result)
    _tell_optimum(result)
    _tell_confirmation(result)
    costs = result.costs
    cost = f", {costs.total:g} {costs.unit}" if costs.total else ""
    say(f"{costs.days:.1f} d, {costs.moves} moves, {costs.distance / 1e3:.0f} km{cost}")
    for note in result.notes:
        say(f"note: {note}")
    say(result.conventions.caution)


def _tell_terms(result: PlanResult) -> None:
    from clockgeo.cli.terminal import show_table

    show_table(
        "What makes up u",
        ["from", "to", "term", "y / 1e-18", "mm"],
        [
            (one.from_end, one.to_end, one.effect, f"{one.y * 1e18:.2f}", f"{one.height_mm:.1f}")
            for one in result.terms
        ],
        left=3,
    )


def _tell_changes(result: PlanResult, *, most: int | None) -> None:
    from clockgeo.cli.terminal import show_table

    rows = []
    for target in result.targets:
        ends = target.from_end, target.to_end
        lines = [one for one in result.sensitivity if (one.from_end, one.to_end) == ends]
        rows += [
            (*ends, one.change, f"{1e3 * one.u:.1f}", f"{1e3 * one.gain:.2f}")
            for one in lines[:most]
        ]
    show_table("What helps most", ["from", "to", "change", "u / mm", "gain / mm"], rows, left=3)


def _tell_alternatives(result: PlanResult) -> None:
    from clockgeo.cli.terminal import show_table

    if result.alternatives:
        show_table(
            "Other techniques (u in mm)",
            ["from", "to", "km", "clocks", "levelling", "GNSS/geoid", "break-even / km"],
            [
                (
                    one.from_end,
                    one.to_end,
                    f"{one.distance / 1e3:.0f}",
                    f"{1e3 * one.u_clock:.1f}",
                    f"{1e3 * one.u_levelling:.1f}",
                    f"{1e3 * one.u_gnss_geoid:.1f}",
                    "none"
                    if one.break_even_distance is None
                    else f"{one.break_even_distance / 1e3:.0f}",
                )
                for one in result.alternatives
            ],
            left=2,
        )


def _tell_optimum(result: PlanResult) -> None:
    from clockgeo.cli.terminal import say, show_table

    if result.optimum is None:
        return
    show_table(
        "How the days are shared out",
        ["candidate", "optimal days", "whole steps"],
        [(one.id, f"{one.optimal_days:.2f}", f"{one.days:g}") for one in result.optimum.shares],
    )
    say(result.optimum.text)
    if not result.optimum.controlled:
        say(f"nothing else checks these sessions: {', '.join(result.optimum.uncontrolled)}")


def _tell_confirmation(result: PlanResult) -> None:
    from clockgeo.cli.terminal import show_table

    if result.confirmation is None:
        return
    show_table(
        f"{result.confirmation.runs} simulated campaigns (mm)",
        ["from", "to", "predicted", "realised", "expected", "agrees"],
        [
            (
                one.from_end,
                one.to_end,
                f"{1e3 * one.predicted_u:.1f}",
                f"{1e3 * one.realised_u:.1f}",
                f"{1e3 * one.lower:.1f} to {1e3 * one.upper:.1f}",
                "yes" if one.agrees else "no",
            )
            for one in result.confirmation.targets
        ],
        left=2,
    )
