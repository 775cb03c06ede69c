"""What `adjust` leaves on disk: JSON, CF netCDF, points as GeoJSON and CSV, datums as WKT2."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.campaign.adjust_results import AdjustResult, PointResult
from clockgeo.campaign.output import RESULT_JSON, RESULT_NETCDF, result_dataset, without_empty
from clockgeo.files import json_text, write_dataset, write_text

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["adjust_files", "adjusted_dataset", "points_csv", "points_geojson", "write_adjusted"]

POINTS_GEOJSON = "points.geojson"
POINTS_CSV = "points.csv"

_DATUM_VARIABLES = (
    ("offset", "m", "zero surface of the datum above that of the campaign"),
    ("u", "m", "standard uncertainty of the offset"),
    ("tilt_north", "1", "rise of the zero surface towards north"),
    ("u_tilt_north", "1", "standard uncertainty of the tilt north"),
    ("tilt_east", "1", "rise of the zero surface towards east"),
    ("u_tilt_east", "1", "standard uncertainty of the tilt east"),
)
_OBSERVATION_VARIABLES = (
    ("value", "m2 s-2", "observed value"),
    ("u", "m2 s-2", "stated standard uncertainty"),
    ("residual", "m2 s-2", "observed minus adjusted"),
    ("standardised", "1", "standardised residual"),
    ("redundancy", "1", "redundancy number"),
    ("minimal_detectable_bias", "m2 s-2", "smallest error that the test finds"),
)


def adjust_files(datums: Sequence[str]) -> tuple[str, ...]:
    """Names of the files that `write_adjusted` may write, for datums of these ids."""
    fixed = (RESULT_JSON, RESULT_NETCDF, POINTS_GEOJSON, POINTS_CSV)
    return (*fixed, *(_wkt_name(datum) for datum in datums))


def _wkt_name(datum: str) -> str:
    return f"datum-{datum.replace(' ', '-')}.wkt"


def write_adjusted(result: AdjustResult, folder: Path, *, replace: bool = False) -> list[Path]:
    """Write all files of an adjustment into `folder`; return their paths.

    Raises
    ------
    OutputError
        If a file cannot be written, or exists and `replace` is false.
    """
    texts = {
        RESULT_JSON: json_text(result),
        POINTS_GEOJSON: json_text(points_geojson(result)),
        POINTS_CSV: points_csv(result),
    }
    for datum in result.datums:
        if datum.epsg_1046 is not None:
            texts[_wkt_name(datum.id)] = datum.epsg_1046.wkt
    for name, text in texts.items():
        write_text(folder / name, text, replace=replace)
    write_dataset(folder / RESULT_NETCDF, adjusted_dataset(result), replace=replace, classic=True)
    return [folder / name for name in (*texts, RESULT_NETCDF)]


def points_geojson(result: AdjustResult) -> dict[str, Any]:
    """Points as a GeoJSON feature collection (RFC 7946): longitude and latitude in degrees."""
    return {
        "type": "FeatureCollection",
        "features": [
            {
                "type": "Feature",
                "id": point.id,
                "geometry": {"type": "Point", "coordinates": [point.longitude, point.latitude]},
                "properties": {
                    "id": point.id,
                    "geopotential_number_m2_s2": point.geopotential_number,
                    "u_m2_s2": point.u,
                    "normal_height_m": point.normal_height,
                    "zero_level": result.conventions.zero_level,
                    "tide_system": result.conventions.tide_system.value,
                },
            }
            for point in result.points
        ],
    }


def points_csv(result: AdjustResult) -> str:
    """Points as CSV with units in the header; cells are empty where nothing is determined."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(
        [
            "id",
            "latitude (deg)",
            "longitude (deg)",
            "geopotential_number (m2 s-2)",
            "u (m2 s-2)",
            "normal_height (m)",
        ]
    )
    writer.writerows(_row(point) for point in result.points)
    return text.getvalue()


def _row(point: PointResult) -> list[object]:
    cells = (point.geopotential_number, point.u, point.normal_height)
    return [
        point.id,
        point.latitude,
        point.longitude,
        *("" if cell is None else repr(cell) for cell in cells),
    ]


def adjusted_dataset(result: AdjustResult) -> xr.Dataset:
    """Return the adjustment as an xarray dataset that follows the CF conventions."""
    points, datums, observations = result.points, result.datums, result.observations
    number = {
        "units": "m2 s-2",
        "long_name": "geopotential number",
        "zero_level": result.conventions.zero_level,
        "tide_system": result.conventions.tide_system.value,
        "ancillary_variables": "point_u",
    }
    variables: dict[str, Any] = {
        "point_geopotential_number": (
            "point",
            _floats(point.geopotential_number for point in points),
            number,
        ),
        "point_u": (
            "point",
            _floats(point.u for point in points),
            {"units": "m2 s-2", "long_name": "standard uncertainty of the geopotential number"},
        ),
        "point_normal_height": (
            "point",
            _floats(point.normal_height for point in points),
            {"units": "m", "long_name": "normal height"},
        ),
    }
    for table, rows, names in (
        ("datum", datums, _DATUM_VARIABLES),
        ("observation", observations, _OBSERVATION_VARIABLES),
    ):
        for name, unit, words in names:
            values = _floats(getattr(row, name) for row in rows)
            variables[f"{table}_{name}"] = (table, values, {"units": unit, "long_name": words})
    kinds = [observation.kind for observation in observations]
    variables["observation_kind"] = ("observation", kinds, {"long_name": "what was observed"})
    coordinates = {
        "point": ("point", [point.id for point in points], {"long_name": "point"}),
        "point_latitude": (
            "point",
            [point.latitude for point in points],
            {"units": "degrees_north", "standard_name": "latitude"},
        ),
        "point_longitude": (
            "point",
            [point.longitude for point in points],
            {"units": "degrees_east", "standard_name": "longitude"},
        ),
        "datum": ("datum", [datum.id for datum in datums], {"long_name": "vertical datum"}),
        "observation": (
            "observation",
            [observation.id for observation in observations],
            {"long_name": "observation"},
        ),
    }
    dataset = result_dataset(result).assign(variables).assign_coords(coordinates)
    return without_empty(dataset)


def _floats(values: Any) -> np.ndarray:
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)
