"""Geoid grids in ISG 2.0 text: a header of key and value, then rows from north to south."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.gravity.geoid_conventions import (
    QUANTITY_WORDS,
    ellipsoid_word,
    metres,
    tide_word,
)
from clockgeo.gravity.grid_content import GridContent, tile_of

__all__ = ["read_isg"]

_ANGLE = re.compile(
    r"""([+-]?)(\d+(?:\.\d*)?)\s*(?:°|deg|d)\s*(?:(\d+(?:\.\d*)?)\s*')?\s*(?:([\d.]+)\s*")?"""
)
_UNKNOWN = {"---", "", "unknown"}
_HEAD = re.compile(r"begin_of_head[ =]*\n(.*?)\nend_of_head[ =]*(?:\n(.*))?\Z", re.DOTALL)


def read_isg(path: Path) -> GridContent:
    """Read an ISG 2.0 file with a regular grid in geographic coordinates.

    Raises
    ------
    DataError
        If the header is missing, a field is missing or odd, or the number of values does not fit;
        names the field.
    ConventionError
        If the data units are not metric.

    Notes
    -----
    The limits are those of the nodes or of the cells around them; which, is told by the counts:
    n - 1 steps lie between the limits, or n.
    """
    head, body = _parts(_text(path), path.name)
    fields = _fields(head)
    _require(fields, "data format", {"grid"}, path.name)
    _require(fields, "coord type", {"geodetic"}, path.name)
    _require(fields, "data ordering", {"n-to-s, w-to-e", "s-to-n, w-to-e"}, path.name)
    rows, columns = (_count(fields, key, path.name) for key in ("nrows", "ncols"))
    values = _values(body, rows, columns, path.name)
    if "nodata" in fields:
        values[np.isclose(values, _number(fields, "nodata", path.name), rtol=1e-9)] = np.nan
    values *= metres(fields.get("data units"), f"{path.name}, field data units")
    latitude = _nodes(fields, "lat", rows, path.name)
    longitude = _nodes(fields, "lon", columns, path.name)
    if not fields.get("data ordering", "").lower().startswith("s"):
        latitude = latitude[::-1]
    tile = tile_of(latitude, longitude, values, where=path.name)
    return GridContent("ISG", (tile,), _stated(fields))


def _text(path: Path) -> str:
    content = path.read_bytes()
    for encoding in ("utf-8-sig", "latin-1"):  # the degree sign is found in both
        try:
            text = content.decode(encoding)
        except UnicodeDecodeError:
            continue
        if "\x00" not in text:
            return text.replace("\r\n", "\n")
    raise DataError("an ISG grid is text, this file is not", where=path.name)


def _parts(text: str, where: str) -> tuple[str, str]:
    match = _HEAD.search(text)
    if match is None:
        raise DataError(
            "no header in the ISG file",
            where=where,
            allowed="begin_of_head ... end_of_head around the fields",
        )
    return match.group(1), match.group(2) or ""


def _fields(head: str) -> dict[str, str]:
    """Key and value of each line, parted by the first colon or equals sign; unknown ones absent."""
    fields = {}
    for line in head.splitlines():
        key, *value = (part.strip() for part in re.split(r"[:=]", line, maxsplit=1))
        if value and value[0].lower() not in _UNKNOWN:
            fields[re.sub(r"\s+", " ", key.lower())] = value[0]
    return fields


def _number(fields: dict[str, str], key: str, where: str) -> float:
    """Return a field as a number; angles may be sexagesimal."""
    text = fields.get(key)
    if text is None:
        raise DataError("a field is missing in the ISG header", value=key, where=where)
    angle = _ANGLE.fullmatch(text)
    try:
        if angle is None:
            return float(text)
        sign, degrees, minutes, seconds = angle.groups()
        size = float(degrees) + float(minutes or 0) / 60.0 + float(seconds or 0) / 3600.0
    except ValueError:
        raise DataError(
            "a field of the ISG header is no number", value=f"{key} = {text!r}", where=where
        ) from None
    return -size if sign == "-" else size


def _count(fields: dict[str, str], key: str, where: str) -> int:
    number = _number(fields, key, where)
    if number != round(number) or not 2 <= number < 1e6:
        raise DataError(
            "a count of the ISG header is out of range",
            value=f"{key} = {fields[key]}",
            where=where,
            allowed="A whole number of at least 2",
        )
    return int(number)


def _values(body: str, rows: int, columns: int, where: str) -> NDArray[np.float64]:
    try:
        values = np.array(body.split(), dtype=np.float64)
    except ValueError as error:
        raise DataError("a value of the ISG grid is no number", value=error, where=where) from None
    if values.size != rows * columns:
        raise DataError(
            "the number of values does not fit the ISG header (nrows, ncols)",
            value=f"{values.size} values for {rows} rows and {columns} columns",
            where=where,
            allowed=f"{rows * columns} values",
            advice="The file may be cut short, or the header wrong",
        )
    return values.reshape(rows, columns)


def _nodes(fields: dict[str, str], axis: str, count: int, where: str) -> NDArray[np.float64]:
    """Ascending node coordinates; limits of cells lie half a step outside the nodes."""
    low, high, step = (
        _number(fields, key, where) for key in (f"{axis} min", f"{axis} max", f"delta {axis}")
    )
    steps_between = (high - low) / step if step else np.inf
    if abs(steps_between - (count - 1)) < 0.01:
        return np.linspace(low, high, count)
    if abs(steps_between - count) < 0.01:
        half = (high - low) / count / 2.0
        return np.linspace(low + half, high - half, count)
    counted = "nrows" if axis == "lat" else "ncols"
    raise DataError(
        f"limits, step and count of the ISG header do not fit "
        f"({axis} min, {axis} max, delta {axis}, {counted})",
        value=f"{low:g} to {high:g} by {step:g} degrees with {count} nodes",
        where=where,
    )


def _require(fields: dict[str, str], key: str, allowed: set[str], where: str) -> None:
    found = fields.get(key)
    if found is not None and found.lower() not in allowed:
        raise DataError(
            "a field of the ISG header is not supported",
            value=f"{key} = {found!r}",
            where=where,
            allowed=" or ".join(sorted(allowed)),
        )


def _stated(fields: dict[str, str]) -> dict[str, str]:
    model_type, kind = fields.get("model type", "").lower(), fields.get("data type", "").lower()
    stated = {
        "quantity": QUANTITY_WORDS.get(kind),
        "tide_system": tide_word(fields["tide system"]) if "tide system" in fields else None,
        "ellipsoid": ellipsoid_word(fields["ref ellipsoid"]) if "ref ellipsoid" in fields else None,
        "model_type": model_type or None,
        "fitted_to": fields.get("height datum") if "hybrid" in model_type else None,
        "source": fields.get("model name"),
    }
    return {key: value for key, value in stated.items() if value}
