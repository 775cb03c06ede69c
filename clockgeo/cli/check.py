"""`clockgeo check`: whether a document is right and its records are there."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from clockgeo.cli.options import Json, Quiet

Campaign = Annotated[
    Path | None, typer.Argument(help="Campaign document (TOML).", show_default=False)
]
Schema = Annotated[
    bool, typer.Option("--schema", help="Print the JSON Schema of the document for editors.")
]


def command(
    campaign: Campaign = None,
    schema: Schema = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Check a campaign document and its records; report all problems at once.

    Exit code 0 if all is well, 1 if there is any problem.

    Example: clockgeo check examples/saddle/campaign.toml
    """
    from clockgeo.campaign import campaign_schema, check_campaign
    from clockgeo.cli.terminal import print_json, progress_shown, say, show_table

    if schema:
        print_json(campaign_schema())
        return
    if campaign is None:
        message = "name a campaign document, or ask for --schema"
        raise typer.BadParameter(message)
    with progress_shown(quiet=quiet or json):
        report = check_campaign(campaign)
    if json:
        print_json({"schema": "clockgeo/check/1", **vars(report)})
    elif not quiet:
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
        for note in report.notes:
            say(f"note: {note}")
        for problem in report.problems:
            say(f"problem: {problem}")
        say("The document and its records are in order." if not report.problems else "")
    if report.problems:
        raise typer.Exit(1)
