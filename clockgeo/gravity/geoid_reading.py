"""`open_geoid`: one face for all grid formats, and nothing about conventions is guessed."""

from __future__ import annotations

import dataclasses
import struct
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import numpy as np

from clockgeo.errors import ClockgeoError, ConventionError, DataError
from clockgeo.gravity.geoid_conventions import (
    QUANTITY_WORDS,
    ellipsoid_word,
    same_level,
    stated_level,
    tide_word,
)
from clockgeo.gravity.geoid_covariance import ErrorModel
from clockgeo.gravity.geoid_model import GeoidModel, Quantity
from clockgeo.gravity.grid_content import GridContent
from clockgeo.gravity.interpolation import Interpolation, checked_interpolation
from clockgeo.gravity.tide_systems import TideSystem, tide_system
from clockgeo.gravity.zero_levels import ZeroLevel, zero_level

__all__ = ["missing_conventions", "open_geoid", "read_grid"]

_NEEDED = {
    "quantity": "geoid_height or height_anomaly",
    "tide_system": f"one of {', '.join(TideSystem)}",
    "zero_level": "a name such as height_reference, or W0 in m² s⁻²",
    "ellipsoid": "a name such as grs80",
}


def open_geoid(
    path: str | Path,
    *,
    quantity: Quantity | str | None = None,
    tide_system: TideSystem | str | None = None,
    zero_level: ZeroLevel | str | float | None = None,
    ellipsoid: str | None = None,
    interpolation: Interpolation | str | None = None,
    u: float | None = None,
    correlation_length: float | None = None,
    fitted_to: str | None = None,
    source: str | None = None,
    variable: str | None = None,
) -> GeoidModel:
    """Open a gridded geoid or quasigeoid model.

    Parameters
    ----------
    path : path
        CF or COARDS netCDF, OGC GGXF, GeoTIFF geodetic grid, GTX or ISG 2.0 text; recognised by
        content.
    quantity, tide_system, zero_level, ellipsoid : optional
        What the file does not say must be stated here; what it does say may not be contradicted.
    interpolation : optional
        Instead of the file's recommendation, or of bilinear.
    u, correlation_length : float, optional
        Size in m and correlation length in m of the model's errors, instead of the file's.
    fitted_to : str, optional
        Levelling datum that a hybrid model was fitted to.
    source : str, optional
        Title or reference of the model, instead of the file's.
    variable : str, optional
        Which variable of a netCDF file, where there are several.

    Returns
    -------
    GeoidModel

    Raises
    ------
    DataError
        If the file is missing, damaged or of no known format.
    ConventionError
        If a convention is missing, unknown or contradicts the file; names the file and the field.
    """
    path = Path(path)
    content = read_grid(path, variable=variable)
    said, name = content.stated, path.name
    given = {
        "quantity": _word(quantity),
        "tide_system": None if tide_system is None else tide_word(str(tide_system)),
        "ellipsoid": None if ellipsoid is None else ellipsoid_word(ellipsoid),
        "fitted_to": fitted_to,
    }
    settled = {key: _settled(key, value, said.get(key), name) for key, value in given.items()}
    level = _settled_level(zero_level, stated_level(said, name), name)
    _require({**settled, "zero_level": level}, name)
    assert level is not None
    tiles = content.tiles
    if u is not None:
        tiles = tuple(dataclasses.replace(tile, u=None) for tile in tiles)
    return GeoidModel(
        name=name,
        tiles=tiles,
        quantity=_quantity(settled["quantity"], name),
        tide_system=_named(_tide, "tide_system", settled["tide_system"], name),
        zero_level=level,
        ellipsoid=str(settled["ellipsoid"]),
        interpolation=_named(
            checked_interpolation,
            "interpolation",
            interpolation or said.get("interpolation") or "bilinear",
            name,
        ),
        errors=_errors(content, u, correlation_length, name),
        epoch=_number(said, "epoch", name),
        hybrid=settled["fitted_to"] is not None or said.get("model_type") == "hybrid",
        fitted_to=settled["fitted_to"],
        source=said.get("source", "") if source is None else source,
    )


def read_grid(path: str | Path, *, variable: str | None = None) -> GridContent:
    """Read the tiles of a grid file and what it states, whatever its format.

    Raises
    ------
    DataError
        If the file is missing, damaged or of no known format.
    """
    path = Path(path)
    if not path.is_file():
        near = sorted(p.name for p in path.parent.glob(f"*{path.suffix}"))
        raise DataError(
            "the grid file is not there",
            value=path,
            advice=f"In that folder: {', '.join(near[:5])}" if near else "Check the path",
        )
    return _reader(path, variable)(path)


def missing_conventions(content: GridContent) -> dict[str, str]:
    """Conventions that a file does not state, and what each must be."""
    said = {**content.stated}
    said.setdefault("zero_level", said.get("zero_level_potential", ""))
    return {key: allowed for key, allowed in _NEEDED.items() if not said.get(key)}


def _reader(path: Path, variable: str | None) -> Callable[[Path], GridContent]:
    """Choose by the first bytes, and by the ending where they do not tell."""
    with path.open("rb") as stream:
        start = stream.read(512)
    if start.startswith((b"\x89HDF\r\n\x1a\n", b"CDF")):
        from clockgeo.gravity.grid_ggxf import is_ggxf, read_ggxf
        from clockgeo.gravity.grid_netcdf import read_netcdf

        ggxf = not start.startswith(b"CDF") and is_ggxf(path)
        return read_ggxf if ggxf else lambda p: read_netcdf(p, variable=variable)
    if start.startswith((b"II*\x00", b"MM\x00*", b"II+\x00", b"MM\x00+")):
        from clockgeo.gravity.grid_geotiff import read_geotiff

        return read_geotiff
    if path.suffix.lower() == ".isg" or b"begin_of_head" in start:
        from clockgeo.gravity.grid_isg import read_isg

        return read_isg
    if path.suffix.lower() == ".gtx" or _looks_like_gtx(start):
        from clockgeo.gravity.grid_gtx import read_gtx

        return read_gtx
    raise DataError(
        "not a grid of a known format",
        value=f"starts with {start[:12]!r}",
        where=path.name,
        allowed="CF netCDF, OGC GGXF, GeoTIFF geodetic grid, GTX or ISG 2.0",
        advice="Check that the file is the grid itself, not its description",
    )


def _looks_like_gtx(start: bytes) -> bool:
    if len(start) < 40:
        return False
    south, west, step, _, rows, columns = struct.unpack_from(">4d2i", start)
    plausible = abs(south) <= 90.0 and abs(west) <= 360.0 and 1e-5 < step < 90.0
    return bool(plausible and 1 < rows < 10**6 and 1 < columns < 10**6)


def _word(quantity: str | None) -> str | None:
    return None if quantity is None else QUANTITY_WORDS.get(quantity, quantity)


def _settled(key: str, given: str | None, said: str | None, where: str) -> str | None:
    """What the user states and what the file states, if they agree."""
    if given is not None and said is not None and given.casefold() != said.casefold():
        raise _contradiction(key, given, said, where)
    return said if given is None else given


def _settled_level(
    given: ZeroLevel | str | float | None, said: ZeroLevel | None, where: str
) -> ZeroLevel | None:
    if given is None:
        return said
    level = zero_level(given)
    if said is not None and not same_level(level, said):
        raise _contradiction("zero_level", level.name, said.name, where)
    return level


def _contradiction(key: str, given: str, said: str, where: str) -> ConventionError:
    return ConventionError(
        f"{key.replace('_', ' ')} contradicts the grid file (field {key})",
        value=f"stated {given}, in the file {said}",
        where=where,
        advice="Leave it out, or correct the file's own statement",
    )


def _require(settled: Mapping[str, Any], where: str) -> None:
    missing = {key: allowed for key, allowed in _NEEDED.items() if settled[key] is None}
    if not missing:
        return
    options = ", ".join(f"--{key.replace('_', '-')}" for key in missing)
    raise ConventionError(
        f"the grid file does not state {', '.join(missing)}",
        where=where,
        allowed="Needed: " + "; ".join(f"{key}, {allowed}" for key, allowed in missing.items()),
        advice=f"State what you know of the model ({options}, or the fields in [geoid])",
    )


def _named(parse: Callable[[str], Any], key: str, text: str | None, where: str) -> Any:
    """Parse a word and, if it is none, say in which file and field it stands."""
    try:
        return parse(str(text))
    except ConventionError as error:
        raise ConventionError(
            error.what, value=error.value, where=f"{where}, field {key}", allowed=error.allowed
        ) from None


def _tide(text: str) -> TideSystem:
    return tide_system(text)


def _quantity(text: str | None, where: str) -> Quantity:
    if text == "geoid_height":
        return "geoid_height"
    if text == "height_anomaly":
        return "height_anomaly"
    raise ConventionError(
        "unknown quantity",
        value=repr(text),
        where=f"{where}, field quantity",
        allowed=_NEEDED["quantity"],
    )


def _errors(
    content: GridContent, u: float | None, correlation_length: float | None, where: str
) -> ErrorModel | None:
    """Error model; of a field of u it holds the root mean square."""
    size = _number(content.stated, "u", where) if u is None else float(u)
    fields = [tile.u for tile in content.tiles if tile.u is not None]
    if size is None and fields:
        size = float(np.sqrt(np.mean([np.nanmean(np.square(f, dtype=float)) for f in fields])))
    if size is None:
        return None
    length = correlation_length
    if length is None:
        length = _number(content.stated, "correlation_length", where)
    try:
        return ErrorModel(u=size, correlation_length=length)
    except ClockgeoError as error:
        raise DataError(
            error.what, value=error.value, where=f"{where}, fields u and correlation_length"
        ) from None


def _number(stated: Mapping[str, str], key: str, where: str) -> float | None:
    text = stated.get(key)
    if text is None:
        return None
    try:
        return float(text)
    except ValueError:
        raise DataError(
            f"the field {key} of the grid is no number",
            value=repr(text),
            where=f"{where}, field {key}",
        ) from None
