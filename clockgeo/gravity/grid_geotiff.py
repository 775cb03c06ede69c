"""Geoid grids as GeoTIFF geodetic grids; needs the extra `clockgeo[geotiff]`.

A nested grid is a further image of the file. What the format calls a geoid undulation is any value
to add to a physical height, so it does not tell a geoid height from a height anomaly: the user
does.
"""

from __future__ import annotations

import warnings
from pathlib import Path
from typing import Any

import numpy as np

from clockgeo.errors import DataError
from clockgeo.gravity.geoid_conventions import crs_from_text, ellipsoid_of_crs, metres
from clockgeo.gravity.grid_content import GridContent, first_wins, tile_of
from clockgeo.gravity.grid_tile import GridTile

__all__ = ["read_geotiff"]

_ROLE, _U_ROLE = "geoid_undulation", "geoid_undulation_uncertainty"
_TYPE = "VERTICAL_OFFSET_GEOGRAPHIC_TO_VERTICAL"


def read_geotiff(path: Path) -> GridContent:
    """Read a GeoTIFF geodetic grid.

    Raises
    ------
    DataError
        If rasterio is not installed, the file is damaged, or no band holds the height of a zero
        surface.
    ConventionError
        If the values have no metric unit.
    """
    rasterio = _rasterio(path.name)
    tiles: list[GridTile] = []
    tags: dict[str, str] = {}
    try:
        with warnings.catch_warnings():
            # An image without a geographic frame is an error here (see _tile), not a warning.
            warnings.simplefilter("ignore", rasterio.errors.NotGeoreferencedWarning)
            with rasterio.open(path) as image:
                names = list(image.subdatasets) or [path]
            for number, name in enumerate(names):
                with rasterio.open(name) as image:
                    tiles.append(_tile(image, f"{path.name}, image {number + 1}"))
                    tags = {**_stated(image, path.name), **tags}
    except rasterio.errors.RasterioError as error:
        raise DataError(
            "the GeoTIFF cannot be read",
            value=error,
            where=path.name,
            advice="It may be cut short: fetch it again and compare its checksum",
        ) from error
    return GridContent("GeoTIFF", first_wins(tiles), tags)


def _rasterio(where: str) -> Any:
    try:
        import rasterio
        import rasterio.errors
    except ImportError:
        raise DataError(
            "GeoTIFF grids need rasterio, which is not installed",
            where=where,
            advice="Install the extra: pip install 'clockgeo[geotiff]'",
        ) from None
    return rasterio


def _tile(image: Any, where: str) -> GridTile:
    kind = image.tags().get("TYPE", _TYPE)
    if kind != _TYPE:
        raise DataError(
            "the GeoTIFF is not a geoid model", value=kind, where=f"{where}, TYPE", allowed=_TYPE
        )
    band, u_band = _bands(image, where)
    transform = image.transform
    if transform.b or transform.d or transform.is_identity:
        what = "has no geographic frame" if transform.is_identity else "is rotated"
        raise DataError(f"the GeoTIFF {what}", value=tuple(transform)[:6], where=where)
    # Pixel centres are the nodes, whether the file counts points or areas: the library that reads
    # it gives the outer edge of the first pixel in both cases.
    latitude = transform.f + transform.e * (np.arange(image.height) + 0.5)
    longitude = transform.c + transform.a * (np.arange(image.width) + 0.5)
    return tile_of(
        latitude,
        longitude,
        _values(image, band, where),
        where=where,
        u=None if u_band is None else _values(image, u_band, where),
        name=image.tags().get("grid_name", ""),
        depth=1 if image.tags().get("parent_grid_name") else 0,
    )


def _bands(image: Any, where: str) -> tuple[int, int | None]:
    """Which band holds the height of the zero surface, and which its u."""
    roles = [
        (image.tags(band).get("DESCRIPTION") or image.descriptions[band - 1] or "").lower()
        for band in range(1, image.count + 1)
    ]
    chosen = [band for band, role in enumerate(roles, 1) if role == _ROLE]
    if not chosen and roles == [""]:
        chosen = [1]
    if len(chosen) != 1:
        raise DataError(
            "no single band with a geoid height in the GeoTIFF",
            value=", ".join(role or "no role" for role in roles),
            where=f"{where}, DESCRIPTION",
            allowed=f"One band with the role {_ROLE}",
        )
    return chosen[0], next((b for b, role in enumerate(roles, 1) if role == _U_ROLE), None)


def _values(image: Any, band: int, where: str) -> np.ndarray:
    """Values of a band in m, NaN where there is none."""
    unit = image.units[band - 1] or image.tags(band).get("UNITTYPE") or "metre"
    factor = metres(unit, f"{where}, UNITTYPE")
    stored = image.read(band, masked=True)
    scale, offset = factor * image.scales[band - 1], factor * image.offsets[band - 1]
    if (scale, offset) == (1.0, 0.0) and stored.dtype == np.float32:
        return np.ma.filled(stored, np.float32(np.nan))
    return np.asarray(np.ma.filled(stored.astype(np.float64), np.nan) * scale + offset)


def _stated(image: Any, where: str) -> dict[str, str]:
    tags = image.tags()
    crs = image.crs.to_wkt() if image.crs else tags.get("interpolation_crs_wkt", "")
    stated = {
        "interpolation": tags.get("recommended_interpolation_method", "").lower(),
        "source": tags.get("TIFFTAG_IMAGEDESCRIPTION"),
        "ellipsoid": ellipsoid_of_crs(crs_from_text(crs, f"{where}, CRS")) if crs else None,
    }
    return {key: value for key, value in stated.items() if value}
