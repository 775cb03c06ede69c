"""Pictures as files, and as part of a page: the same bytes for the same picture."""

from __future__ import annotations

import io
import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

from clockgeo.errors import DataError, OutputError
from clockgeo.files import whole_file
from clockgeo.report.style import LIGHT, drawing

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["PICTURE_SUFFIXES", "checked_picture", "inline_svg", "save_picture"]

PICTURE_SUFFIXES = (".png", ".svg", ".pdf")
_NO_DATES: dict[str, dict[str, Any]] = {
    ".png": {"Software": None},
    ".svg": {"Date": None, "Creator": None, "Format": None, "Type": None},
    ".pdf": {"CreationDate": None, "ModDate": None, "Creator": None, "Producer": None},
}
_COLOUR_NAMES = {colour: name for name, colour in LIGHT.items()}
_COLOUR = re.compile("|".join(LIGHT.values()))
_PAINT = re.compile(r'(?<=\s)(style|fill|stroke)="[^"]*"')
_FONT = re.compile(r"font(-family)?: ?(?P<before>[^;'\"]*?)'DejaVu Sans'[^;\"]*")
_TAG = re.compile(r"<[^>]+>")
_PREAMBLE = re.compile(r"\A.*?(?=<svg)", re.DOTALL)
_NOT_FOR_PAGES = re.compile(
    r"\s*(<metadata>.*?</metadata>|<defs>\s*<style type=\"text/css\">.*?</style>\s*</defs>)",
    re.DOTALL,
)
_IDENTIFIER = re.compile(r'(?<=\bid=")(?=[^"])|(?<=url\(#)|(?<=href="#)')
_LONG_DECIMALS = re.compile(r"(\d+\.\d{2})\d+")


def save_picture(figure: Figure, path: str | Path, *, replace: bool = False) -> Path:
    """Write a figure as PNG, SVG or PDF, by the suffix.

    Raises
    ------
    DataError
        If the suffix is another.
    OutputError
        If the file cannot be written, or exists and `replace` is false.
    """
    path = checked_picture(path, replace=replace)
    suffix = path.suffix.lower()
    with whole_file(path, replace=replace) as partial, drawing():
        figure.savefig(partial, format=suffix[1:], metadata=_NO_DATES[suffix])
    return path


def checked_picture(path: str | Path, *, replace: bool = False) -> Path:
    """Return the path of a picture, refused before any work if it cannot be written later.

    Raises
    ------
    DataError
        If the suffix is none of `PICTURE_SUFFIXES`.
    OutputError
        If the file exists and `replace` is false, or its folder is missing.
    """
    path = Path(path)
    if path.suffix.lower() not in PICTURE_SUFFIXES:
        raise DataError(
            "no such kind of picture",
            value=repr(path.name),
            allowed=f"One of {', '.join(PICTURE_SUFFIXES)}",
        )
    if path.exists() and not replace:
        raise OutputError(
            "the picture exists already",
            value=path,
            advice="Choose another name, or allow replacing it with --force",
        )
    if not path.parent.is_dir():
        raise OutputError(
            "the folder of the picture is not there", value=path.parent, advice="Create it first"
        )
    return path


def inline_svg(figure: Figure, prefix: str, title: str) -> str:
    """Return a figure as an SVG element for a page.

    Parameters
    ----------
    figure : Figure
    prefix : str
        Put before every id, so that several pictures fit on one page; letters and digits.
    title : str
        Plain text, what the picture shows, for those who cannot see it.

    Returns
    -------
    str
        An ``<svg>`` element whose colours follow the page's, with a title for screen readers.
    """
    from markupsafe import escape

    stream = io.StringIO()
    with drawing():
        figure.savefig(stream, format="svg", metadata=_NO_DATES[".svg"], transparent=True)
    text = _NOT_FOR_PAGES.sub("", _PREAMBLE.sub("", stream.getvalue()))
    text = _TAG.sub(lambda tag: _for_page(tag.group(), prefix), text)
    start, end = text.split(">", 1)
    start = re.sub(r' (width|height)="[^"]*pt"', "", start)
    label = f"{prefix}-title"
    return (
        f'{start} preserveAspectRatio="xMinYMin meet" role="img" aria-labelledby="{label}">\n'
        f'<title id="{label}">{escape(title)}</title>{end}'
    )


def _for_page(tag: str, prefix: str) -> str:
    """Change one tag; the text between tags, which may come from users, is never touched."""
    tag = _PAINT.sub(lambda paint: _COLOUR.sub(_as_variable, paint.group()), tag)
    tag = _LONG_DECIMALS.sub(r"\1", _FONT.sub(_without_family, tag))
    return _IDENTIFIER.sub(f"{prefix}-", tag)


def _as_variable(colour: re.Match[str]) -> str:
    return f"var(--{_COLOUR_NAMES[colour.group()]})"


def _without_family(font: re.Match[str]) -> str:
    """Leave the family to the page; keep size and weight."""
    rest = font.group("before").strip()
    return f"font: {rest} var(--sans)" if rest else "font-family: var(--sans)"
