"""A text table as bytes: comments, header line, separator, and the columns a reader asks for."""

from __future__ import annotations

import difflib
import gzip
import mmap
import re
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError

if TYPE_CHECKING:
    import polars as pl

__all__ = ["Columns", "TextTable", "open_table", "unpacked"]

_GZIP_MAGIC = b"\x1f\x8b"
_INK = re.compile(rb"\S")
_CONTROL = re.compile(rb"[\x00-\x08\x0e-\x1f]")
_NUMERIC = re.compile(r"[+-]?(\d|\.\d).*|[+-]?(nan|inf(inity)?)", re.IGNORECASE)
_SAMPLED_LINES = 50


Content = bytes | mmap.mmap
"""A text in memory, or mapped from its file."""


def unpacked(content: Content, *, where: str) -> Content:
    """Undo gzip, recognised by its first bytes, and check that this is text.

    Raises
    ------
    DataError
        If the file is empty, binary, or a damaged or truncated gzip.
    """
    if content[:2] == _GZIP_MAGIC:
        try:
            content = gzip.decompress(content)
        except (EOFError, zlib.error, gzip.BadGzipFile) as error:
            raise DataError(
                f"the gzip file is truncated or damaged ({error})",
                where=where,
                advice="Copy the file again from its source",
            ) from None
    if not _INK.search(content):
        raise DataError("the file is empty", where=where)
    if _CONTROL.search(content[:65_536]):
        raise DataError(
            "the file is binary, not text",
            where=where,
            allowed="Text, gzip'd text, or netCDF with the ending .nc",
        )
    return content[3:] if content[:3] == b"\xef\xbb\xbf" else content


@dataclass(frozen=True)
class TextTable:
    """Where the rows of a text begin, and how their fields are separated.

    Attributes
    ----------
    content : bytes or mapped file
        The whole text.
    offset : int
        Where its first row begins.
    path : Path or None
        The file that holds nothing but this text, to be read without a copy.
    first_line : int
        Number of the first row's line in the file, counted from 1.
    separator : bytes
        One byte; a blank stands for any run of blanks.
    width : int
        Most fields of the first rows.
    first_width : int
        Fields of the very first row.
    names : tuple of str
        Column names of the header line; empty without one.
    where : str
        The file, for messages.
    """

    content: Content
    offset: int
    path: Path | None
    first_line: int
    separator: bytes
    width: int
    first_width: int
    names: tuple[str, ...]
    where: str

    def position(self, column: int | str) -> int:
        """Position, from 0, of a column given by number (from 1) or name.

        Raises
        ------
        DataError
            If the table has no such column.
        """
        if isinstance(column, int):
            if column <= self.width:
                return column - 1
            raise DataError(
                "there is no such column",
                value=column,
                where=self.where,
                allowed=f"Columns 1 to {self.width}, counted from the left",
            )
        if column in self.names:
            return self.names.index(column)
        near = difflib.get_close_matches(column, self.names, n=1, cutoff=0.4)
        raise DataError(
            "there is no column of this name",
            value=repr(column),
            where=self.where,
            allowed=f"Names in the header: {', '.join(self.names)}" if self.names else None,
            advice=f"Did you mean {near[0]!r}?" if near else "Give the column by its number",
        )

    def columns(self, wanted: Mapping[str, tuple[int, pl.DataType]]) -> Columns:
        """Read columns by position (from 0) and polars type.

        Raises
        ------
        DataError
            If one column is wanted twice.
        """
        places = {name: place for name, (place, _) in wanted.items()}
        for name, place in places.items():
            twin = next((other for other, at in places.items() if at == place), name)
            if twin != name:
                raise DataError(
                    f"{twin} and {name} are said to be in the same column",
                    value=place + 1,
                    where=self.where,
                )
        body, lines, width, places = self._regular(places)
        layout = _Layout(body, width, places, self.separator)
        frame = layout.parsed({name: kind for name, (_, kind) in wanted.items()})
        if lines is None:
            lines = np.arange(frame.height) + self.first_line
        return Columns(frame, lines, layout)

    def _regular(
        self, places: dict[str, int]
    ) -> tuple[bytes | Path, NDArray[np.int64] | None, int, dict[str, int]]:
        """Tidy rows without comments; their lines unless consecutive; width and places."""
        spaced = self.separator == b" "
        untidy = (b"#", b'"', b"\r") if spaced else (b"#", b'"', b"\r", b" ")
        tidy = max(places.values()) < self.first_width
        tidy &= all(self.content.find(mark, self.offset) < 0 for mark in untidy)
        if tidy and not spaced and self.offset == 0 and self.path is not None:
            return self.path, None, self.first_width, places
        body = self.content[self.offset :]
        if spaced:
            rows = body.count(b"\n") + (not body.endswith(b"\n"))
            tidy &= body.count(b" ") == rows * (self.first_width - 1)
        if tidy:
            return body, None, self.first_width, places
        return self._tidied(body.replace(b"\r\n", b"\n").replace(b"\r", b"\n"), places)

    def _tidied(
        self, body: bytes, places: dict[str, int]
    ) -> tuple[bytes, NDArray[np.int64], int, dict[str, int]]:
        """The wanted fields of every row that is not blank or a comment, row by row."""
        rows: list[bytes] = []
        lines: list[int] = []
        order = sorted(set(places.values()))
        for number, line in enumerate(body.split(b"\n"), start=self.first_line):
            text = line.partition(b"#")[0]
            if not text.strip():
                continue
            parts = _split(text, self.separator)
            fields = [parts[at].strip(b' \t"') if at < len(parts) else b"" for at in order]
            rows.append(self.separator.join(fields))
            lines.append(number)
        moved = {name: order.index(at) for name, at in places.items()}
        return b"\n".join(rows), np.array(lines, dtype=np.int64), len(order), moved


@dataclass(frozen=True)
class _Layout:
    """Tidy rows, and where the wanted fields are in them."""

    body: bytes | Path
    width: int
    places: Mapping[str, int]
    separator: bytes

    def parsed(self, types: Mapping[str, pl.DataType]) -> pl.DataFrame:
        """Columns of these types; null where the text is not of its type."""
        import polars as pl

        if not self.body:
            return pl.DataFrame(schema=dict(types))
        names = [f"column {position}" for position in range(self.width)]
        at = {position: name for name, position in self.places.items()}
        schema = {
            name: types[at[position]] if position in at else pl.String()
            for position, name in enumerate(names)
        }
        frame = pl.read_csv(
            self.body,
            has_header=False,
            separator=self.separator.decode(),
            quote_char=None,
            schema=schema,
            columns=sorted(at),
            truncate_ragged_lines=True,
            ignore_errors=True,
            encoding="utf8-lossy",
        )
        return frame.select(
            pl.col(names[position]).alias(name) for name, position in self.places.items()
        )


@dataclass(frozen=True)
class Columns:
    """Columns that were read.

    Attributes
    ----------
    frame : polars DataFrame
        A column a name; null where the text is not of the column's type.
    lines : int64 array
        Line number of each row of `frame`.
    """

    frame: pl.DataFrame
    lines: NDArray[np.int64]
    _layout: _Layout

    def texts(self, rows: NDArray[np.bool_]) -> pl.DataFrame:
        """The fields of some rows as text, with their position in column ``row``."""
        import polars as pl

        texts = self._layout.parsed(dict.fromkeys(self.frame.columns, pl.String()))
        positions = pl.Series("row", np.arange(self.frame.height))
        return texts.with_columns(positions).filter(pl.Series(rows))


def open_table(content: Content, *, where: str, path: Path | None = None) -> TextTable:
    """Find the header, the separator and the first row of a text.

    The header is the first line whose fields are all words, or the last comment before the first
    row.

    Parameters
    ----------
    content : bytes or mapped file
        Text as `unpacked` gives it.
    where : str
        The file, for messages.
    path : Path, optional
        The file, if it holds exactly this text.

    Raises
    ------
    DataError
        If there is no row.
    """
    comment, header = b"", b""
    starts = _content_lines(content)
    for number, offset, line in starts:
        if line.startswith(b"#"):
            comment = line.lstrip(b"#").strip()
            continue
        if not header and _is_words(line):
            header = line
            continue
        sample = [line.partition(b"#")[0].strip(b" \r"), *_rows_after(starts)]
        separator = _separator_of(sample)
        widths = [len(_split(row, separator)) for row in sample]
        names = tuple(_words(header or comment, separator)) if header or comment else ()
        return TextTable(
            content, offset, path, number, separator, max(widths), widths[0], names, where
        )
    raise DataError("the file holds no row", where=where)


def _content_lines(content: Content) -> Iterator[tuple[int, int, bytes]]:
    """Line number, offset and stripped text of every line that is not blank."""
    number, offset = 0, 0
    while offset < len(content):
        number += 1
        end = content.find(b"\n", offset)
        end = len(content) if end < 0 else end
        line = content[offset:end].strip(b" \r")
        if line.strip():
            yield number, offset, line
        offset = end + 1


def _rows_after(lines: Iterator[tuple[int, int, bytes]]) -> list[bytes]:
    sample: list[bytes] = []
    for _, _, line in lines:
        if not line.startswith(b"#"):
            sample.append(line.partition(b"#")[0].strip(b" \r"))
        if len(sample) == _SAMPLED_LINES:
            break
    return sample


def _separator_of(rows: list[bytes]) -> bytes:
    """Tab, semicolon or comma where most rows have it; else blanks."""
    for separator in (b"\t", b";", b","):
        if sum(separator in row for row in rows) > len(rows) / 2:
            return separator
    return b" "


def _split(line: bytes, separator: bytes) -> list[bytes]:
    return line.split() if separator == b" " else line.split(separator)


def _words(line: bytes, separator: bytes) -> list[str]:
    """Column names of a header; one written with another separator than the rows counts too."""
    text = line.decode("utf-8", errors="replace")
    mark = separator.decode()
    parts = text.split(mark) if mark.strip() and mark in text else re.split(r"[,;\t ]+", text)
    return [part.strip().strip('"') for part in parts]


def _is_words(line: bytes) -> bool:
    """Whether no field of the line starts like a number, as in a header."""
    fields = re.split(r"[,;\s]+", line.decode("utf-8", errors="replace"))
    return not any(_NUMERIC.fullmatch(field.strip('"')) for field in fields if field)
