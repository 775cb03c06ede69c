"""`clockgeo check`: whether a document is right and its records are there."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from clockgeo.cli.options import Json, Quiet

if TYPE_CHECKING:
    from clockgeo.campaign.checking import CheckReport

Campaign = Annotated[
    Path | None, typer.Argument(help="Campaign document (TOML).", show_default=False)
]
Schema = Annotated[
    bool, typer.Option("--schema", help="Print the JSON Schema of the document for editors.")
]


class ResultKind(StrEnum):
    """Commands whose results have a schema."""

    level = "level"
    adjust = "adjust"
    plan = "plan"


OfResult = Annotated[
    ResultKind | None,
    typer.Option("--result-schema", help="Print the JSON Schema of a result: level, adjust, plan."),
]


def command(
    campaign: Campaign = None,
    schema: Schema = False,
    result_schema: OfResult = None,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Check a campaign document and its records; report all problems at once.

    Exit code 0 if all is well, 1 if there is any problem.

    Example: clockgeo check examples/saddle/campaign.toml
    """
    from clockgeo.campaign import campaign_schema, check_campaign
    from clockgeo.cli.terminal import print_json, progress_shown, say

    if schema:
        print_json(campaign_schema())
        return
    if result_schema is not None:
        print_json(_schema_of(result_schema))
        return
    if campaign is None:
        message = "name a campaign document, or ask for --schema or --result-schema"
        raise typer.BadParameter(message)
    with progress_shown(quiet=quiet or json):
        report = check_campaign(campaign)
    if json:
        print_json({"schema": "clockgeo/check/1", **vars(report)})
    elif not quiet:
        if report.sessions:
            _show_sessions(report)
        for note in report.notes:
            say(f"note: {note}")
        for doubt in report.doubts:
            say(f"doubt: {doubt}")
        for problem in report.problems:
            say(f"problem: {problem}")
        if not report.problems:
            doubts = ", but look at the doubts above first" if report.doubts else ""
            say(f"The document and its records are in order{doubts}.")
    if report.problems:
        raise typer.Exit(1)


def _show_sessions(report: CheckReport) -> None:
    from clockgeo.cli.terminal import show_table

    show_table(
        report.name,
        ["session", "numerator", "denominator", "record", "valid / s", "uptime"],
        [
            (
                s.id,
                s.numerator,
                s.denominator,
                s.state,
                "" if s.valid_seconds is None else f"{s.valid_seconds:.0f}",
                "" if s.uptime is None else f"{100 * s.uptime:.0f} %",
            )
            for s in report.sessions
        ],
        left=4,
    )


def _schema_of(kind: ResultKind) -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of what a command writes and prints with --json."""
    from clockgeo.campaign import AdjustResult, LevelResult
    from clockgeo.planning import PlanResult
    from clockgeo.tables import Table

    models: dict[str, type[Table]] = {
        "level": LevelResult,
        "adjust": AdjustResult,
        "plan": PlanResult,
    }
    schema = models[kind.value].model_json_schema(by_alias=True, mode="serialization")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}
