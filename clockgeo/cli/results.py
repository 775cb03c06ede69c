"""Where a command's results go: the folder, the page and its pictures as files."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from clockgeo.report.page import Page

__all__ = ["ResultPlace"]


@dataclass(frozen=True)
class ResultPlace:
    """A folder that was found fit to write to, and what may be written.

    Attributes
    ----------
    folder : Path
        Of the results.
    figures : Path or None
        Folder for the pictures as files, if they were asked for.
    suffix : str
        Of the pictures.
    replace : bool
        Whether existing files may be replaced.
    """

    folder: Path
    figures: Path | None
    suffix: str
    replace: bool

    @classmethod
    def prepared(
        cls, out: Path, names: Sequence[str], *, figures: Path | None, kind: str, replace: bool
    ) -> ResultPlace:
        """Make the folders and refuse, before any work, what could not be written later.

        Raises
        ------
        OutputError
            If a folder cannot be written to, or a result exists and `replace` is false.
        """
        from clockgeo.campaign import prepare_folder
        from clockgeo.report import PAGE, prepare_figures

        folder = prepare_folder(out, (*names, PAGE), replace=replace)
        suffix = f".{kind}"
        if figures is not None:
            prepare_figures(figures, suffix=suffix, replace=replace)
        return cls(folder, figures, suffix, replace)

    def write_page(self, page: Page) -> list[Path]:
        """Write the page, and its pictures where they were asked for; return all paths."""
        from clockgeo.report import PAGE, write_figures, write_page

        written = [write_page(self.folder / PAGE, page, replace=self.replace)]
        if self.figures is not None:
            written += write_figures(page, self.figures, suffix=self.suffix, replace=self.replace)
        return written
