"""One self-contained page: sections of words, pictures and tables, put into the template."""

from __future__ import annotations

import base64
import hashlib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING

from clockgeo.errors import OutputError
from clockgeo.files import write_text
from clockgeo.progress import track
from clockgeo.report.embedding import checked_picture, inline_svg, save_picture
from clockgeo.report.sheets import Sheet
from clockgeo.report.style import DARK, LIGHT

if TYPE_CHECKING:
    from jinja2 import Environment
    from matplotlib.figure import Figure

__all__ = [
    "Answer",
    "Page",
    "Picture",
    "Section",
    "pictures_of",
    "prepare_figures",
    "render_page",
    "write_figures",
    "write_page",
]


@dataclass(frozen=True, eq=False)
class Picture:
    """A figure with what it shows in words.

    Attributes
    ----------
    id : str
        Letters, digits and hyphens; unique on the page, and its file name.
    figure : Figure
    caption : str
        Under the picture.
    alt : str
        For those who cannot see it.
    """

    id: str
    figure: Figure
    caption: str
    alt: str

    @property
    def svg(self) -> str:
        """The figure as an element of the page."""
        return inline_svg(self.figure, self.id, self.alt)


@dataclass(frozen=True)
class Section:
    """A part of the page under one heading.

    Attributes
    ----------
    id, title : str
    paragraphs : tuple of str
        Plain text.
    parts : tuple of Picture or Sheet
        In reading order.
    notes : tuple of str
        Listed at the end.
    """

    id: str
    title: str
    paragraphs: tuple[str, ...] = ()
    parts: tuple[Picture | Sheet, ...] = ()
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Answer:
    """One thing that the reader came for.

    Attributes
    ----------
    what : str
        Such as "Kesselin Saddle above Harbel".
    value : str
        With its uncertainty and unit.
    also : tuple of str
        The same in other terms, and how to read it.
    verdict : str
        What speaks for or against it, in one sentence; empty where nothing does.
    """

    what: str
    value: str
    also: tuple[str, ...] = ()
    verdict: str = ""


@dataclass(frozen=True)
class Page:
    """Everything on a page.

    Attributes
    ----------
    title : str
    kind : str
        What the page reports, such as "Clock levelling".
    summary : str
        One line under the title.
    answers : tuple of Answer
    sections : tuple of Section
    caution : str
    version : str
        Of clockgeo.
    """

    title: str
    kind: str
    summary: str
    answers: tuple[Answer, ...]
    sections: tuple[Section, ...]
    caution: str
    version: str

    def _repr_html_(self) -> str:
        """Show the page in a notebook, in a frame of its own."""
        from markupsafe import escape

        frame = "width: 100%; height: 50rem; border: 0"
        text = escape(render_page(self))
        return f'<iframe title="{escape(self.kind)}" style="{frame}" srcdoc="{text}"></iframe>'


def render_page(page: Page) -> str:
    """Return the page as HTML; all text of `page` is escaped."""
    script = _package_text("page.js")
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    return (
        _environment()
        .get_template("page.html.j2")
        .render(
            page=page,
            style=_package_text("page.css"),
            script=script,
            script_digest=digest,
            light=LIGHT,
            dark=DARK,
        )
    )


def write_page(path: str | Path, page: Page, *, replace: bool = False) -> Path:
    """Write the page as one self-contained HTML file.

    Raises
    ------
    OutputError
        If the file cannot be written, or exists and `replace` is false.
    """
    write_text(path, render_page(page), replace=replace)
    return Path(path)


def write_figures(
    page: Page, folder: str | Path, *, suffix: str = ".png", replace: bool = False
) -> list[Path]:
    """Write every picture of a page as a file of its own, named by its id.

    Parameters
    ----------
    page : Page
    folder : path
        Made if missing.
    suffix : str
        ``.png``, ``.svg`` or ``.pdf``.
    replace : bool
        Whether existing files may be replaced.

    Raises
    ------
    DataError
        If the suffix is another.
    OutputError
        If a file exists and `replace` is false, or cannot be written.
    """
    folder = prepare_figures(folder, suffix=suffix, replace=replace)
    return [
        save_picture(picture.figure, folder / f"{picture.id}{suffix}", replace=replace)
        for picture in track(pictures_of(page), "writing pictures")
    ]


def prepare_figures(folder: str | Path, *, suffix: str, replace: bool = False) -> Path:
    """Make a folder for pictures; refuse, before any work, what could not be written later.

    Raises
    ------
    DataError
        If the suffix is none of ``.png``, ``.svg`` and ``.pdf``.
    OutputError
        If the folder cannot be made, or holds such pictures and `replace` is false.
    """
    folder = Path(folder)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise OutputError(
            f"cannot make the folder of pictures ({error.strerror})",
            value=folder,
            advice="Choose another with --figures",
        ) from error
    checked_picture(folder / f"new{suffix}", replace=True)
    for present in sorted(folder.glob(f"*{suffix}")):
        checked_picture(present, replace=replace)
    return folder


def pictures_of(page: Page) -> list[Picture]:
    """All pictures on a page, in order."""
    parts = [part for section in page.sections for part in section.parts]
    return [part for part in parts if isinstance(part, Picture)]


def _is_picture(part: object) -> bool:
    return isinstance(part, Picture)


def _package_text(name: str) -> str:
    return files("clockgeo.report").joinpath("templates", name).read_text(encoding="utf-8")


@cache
def _environment() -> Environment:
    from jinja2 import Environment, PackageLoader, StrictUndefined

    environment = Environment(
        loader=PackageLoader("clockgeo.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.tests["picture"] = _is_picture
    return environment
