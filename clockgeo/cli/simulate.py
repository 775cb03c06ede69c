"""`clockgeo simulate`: records of a campaign, drawn from its stated truth."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from clockgeo.cli.options import Force, Json, Quiet

Campaign = Annotated[Path, typer.Argument(help="Campaign document with a [truth] table.")]
Seed = Annotated[int, typer.Option("--seed", min=0, help="Equal seeds give equal bytes.")]
Out = Annotated[
    Path | None,
    typer.Option("--out", help="Folder for the records; the document's own folder if absent."),
]


def command(
    campaign: Campaign,
    seed: Seed,
    out: Out = None,
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Draw the records of a campaign from its stated truth.

    Every session that names a record gets one: clock and link noise, effects drawn from their u,
    tide, gaps, outliers, and stamps rounded as in real records.

    Example: clockgeo simulate examples/saddle/campaign.toml --seed 1 --out results/simulated
    """
    from clockgeo.campaign import read_document
    from clockgeo.cli.terminal import print_json, progress_shown, say
    from clockgeo.planning import simulate_records

    document = read_document(campaign)
    folder = out if out is not None else document.folder
    with progress_shown(quiet=quiet or json):
        written = simulate_records(
            document.campaign, seed=seed, folder=folder, tables=document.folder, replace=force
        )
    if json:
        print_json({"schema": "clockgeo/simulate/1", "seed": seed, "records": written})
    else:
        for path in written:
            say(str(path), quiet=quiet)
