"""Geoid grids in GTX: a 40-byte header and float32 rows from south to north, big-endian.

The file holds metres and no conventions at all; the user states them.
"""

from __future__ import annotations

import struct
from pathlib import Path

import numpy as np

from clockgeo.errors import DataError
from clockgeo.files import whole_file
from clockgeo.gravity.grid_content import GridContent, tile_of
from clockgeo.gravity.grid_tile import GridTile

__all__ = ["read_gtx", "write_gtx"]

_HEADER = struct.Struct(">4d2i")
_NO_DATA = np.float32(-88.8888)
_LARGEST = 1000.0  # m: no separation is that large, so larger values mark missing data


def read_gtx(path: Path) -> GridContent:
    """Read a GTX file.

    Raises
    ------
    DataError
        If the header is not that of a grid or does not fit the length of the file.
    """
    content = path.read_bytes()
    if len(content) < _HEADER.size:
        raise DataError("too short for a GTX grid", value=f"{len(content)} bytes", where=path.name)
    south, west, latitude_step, longitude_step, rows, columns = _HEADER.unpack_from(content)
    expected = _HEADER.size + 4 * rows * columns
    if not (rows > 1 and columns > 1 and 0.0 < latitude_step < 90.0 and 0.0 < longitude_step < 180):
        raise DataError(
            "not the header of a GTX grid",
            value=f"{rows} rows, {columns} columns, steps {latitude_step:g} and {longitude_step:g}",
            where=path.name,
            allowed="South, west, two steps in degrees, rows and columns, big-endian",
        )
    if len(content) != expected:
        raise DataError(
            "the GTX file does not have the length its header says",
            value=f"{len(content)} bytes for {rows} rows and {columns} columns",
            where=path.name,
            allowed=f"{expected} bytes",
            advice="It may be cut short: fetch it again",
        )
    values = np.frombuffer(content, ">f4", offset=_HEADER.size).reshape(rows, columns)
    values = values.astype(np.float32)
    values[(values == _NO_DATA) | ~(np.abs(values) < _LARGEST)] = np.nan
    latitude = south + latitude_step * np.arange(rows)
    longitude = west + longitude_step * np.arange(columns)
    return GridContent("GTX", (tile_of(latitude, longitude, values, where=path.name),))


def write_gtx(tile: GridTile, path: str | Path, *, replace: bool = False) -> None:
    """Write a tile as GTX; missing nodes become -88.8888, values are rounded to float32.

    Raises
    ------
    OutputError
        If the file exists and `replace` is false, or cannot be written.
    """
    rows, columns = tile.values.shape
    header = _HEADER.pack(
        tile.south, tile.west, tile.latitude_step, tile.longitude_step, rows, columns
    )
    values = np.where(np.isnan(tile.values), _NO_DATA, tile.values).astype(">f4")
    with whole_file(path, replace=replace) as partial:
        partial.write_bytes(header + values.tobytes())
