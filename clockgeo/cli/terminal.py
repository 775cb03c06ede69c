"""What commands print: tables, lines, JSON, and the progress of long work."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from typing import Any

from rich.console import Console
from rich.table import Table

from clockgeo.files import json_text
from clockgeo.progress import shown_by

__all__ = ["print_json", "progress_shown", "say", "show_table"]


def say(text: str = "", *, quiet: bool = False) -> None:
    """Print a line of plain text (never interpreted as markup) unless `quiet`."""
    if not quiet:
        Console(highlight=False, markup=False, soft_wrap=True).print(text)


def print_json(value: Any) -> None:
    """Print one JSON object on stdout."""
    sys.stdout.write(json_text(value))


def show_table(
    title: str, columns: Sequence[str], rows: Iterable[Sequence[str]], *, left: int = 1
) -> None:
    """Print a table; the first `left` columns are words, the others numbers aligned right."""
    table = Table(box=None, pad_edge=False)
    for position, name in enumerate(columns):
        table.add_column(name, justify="left" if position < left else "right", overflow="fold")
    for row in rows:
        table.add_row(*row)
    console = Console(highlight=False, markup=False, width=None if sys.stdout.isatty() else 110)
    # A title of the table's own would break at the table's width.
    console.print(title, style="bold", soft_wrap=True)
    console.print(table)
    console.print()


@contextmanager
def progress_shown(*, quiet: bool = False) -> Iterator[None]:
    """Show progress with the time left on stderr; silent when piped or `quiet`."""
    if quiet or not sys.stderr.isatty():
        yield
        return
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (TextColumn("{task.description}"), BarColumn(), TimeRemainingColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:

        def listener(steps: Iterable[Any], label: str, total: int | None) -> Iterable[Any]:
            return bar.track(steps, description=label, total=total)

        with shown_by(listener):
            yield
