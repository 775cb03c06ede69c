"""The application: which commands there are, how errors are told, which exit codes they get.

Exit codes: 0 done, 1 data or convention error, 2 wrong usage. A command module is imported only
when its command is called or its help is asked for, so that the bare `--help` stays instant.
"""

from __future__ import annotations

import importlib
import sys
from typing import Annotated, Any

import typer
from typer.core import TyperGroup

__all__ = ["app", "main"]

COMMANDS: dict[str, str] = {
    "check": "Check a campaign document and its records; report all problems at once.",
    "level": "Turn a campaign's records into potential differences and heights.",
    "adjust": "Reconcile height datums with clocks, levelling and GNSS/geoid.",
    "plan": "Predict what a planned campaign will reach, and how to reach more.",
    "simulate": "Draw the records of a campaign from its stated truth.",
    "screen": "Flag the epochs of a record that should not count, with reasons.",
    "stability": "Deviations, noise model and uncertainty of the mean of records.",
    "tide": "Tidal potential and frequency shift at a place or between two.",
    "redshift": "Shift of a clock at a place against the zero level of the time scale.",
    "height": "Convert between geopotential numbers, heights and tide systems.",
    "geoid": "Sample, describe or convert a gridded geoid model.",
}
"""Command name -> one line of help, in the order of a campaign's life."""


class LazyCommands(TyperGroup):
    """A group that imports `clockgeo.cli.<command>` on demand and tells errors in one paragraph."""

    def list_commands(self, ctx: Any) -> list[str]:  # noqa: ARG002
        return list(COMMANDS)

    def get_command(self, ctx: Any, name: str) -> Any:  # noqa: ARG002
        if name not in COMMANDS:
            return None
        module = importlib.import_module(f"clockgeo.cli.{name}")
        single = typer.Typer(add_completion=False, rich_markup_mode=None)
        single.command(name)(module.command)
        return typer.main.get_command(single)

    def format_commands(self, ctx: Any, formatter: Any) -> None:  # noqa: ARG002
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))

    def invoke(self, ctx: Any) -> Any:
        from clockgeo.errors import ClockgeoError

        try:
            return super().invoke(ctx)
        except (ClockgeoError, OSError) as error:
            if ctx.params.get("debug"):
                raise
            typer.echo(f"clockgeo: {error}", err=True)
            raise typer.Exit(1) from None


app = typer.Typer(
    cls=LazyCommands,
    name="clockgeo",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
)


def _version(asked: bool) -> None:
    if asked:
        from clockgeo.version import __version__

        typer.echo(f"clockgeo {__version__}")
        raise typer.Exit


Version = Annotated[
    bool,
    typer.Option("--version", callback=_version, is_eager=True, help="Show the version and stop."),
]
Debug = Annotated[bool, typer.Option("--debug", help="Show the traceback of an error.")]


@app.callback()
def clockgeo(version: Version = False, debug: Debug = False) -> None:
    """From optical clock comparisons to geopotential differences, heights and datums."""
    del version, debug  # both are acted upon before any command runs


def main() -> None:
    """Run the command line; the console script `clockgeo` calls this."""
    app(prog_name="clockgeo", args=sys.argv[1:])
