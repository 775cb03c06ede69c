"""Results on disk: `result.json`, CF netCDF, correlations as CSV; whole or not at all."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.campaign.adjust_results import ADJUST_SCHEMA, AdjustResult
from clockgeo.campaign.correlation_output import correlations_csv, with_correlations
from clockgeo.campaign.results import LEVEL_SCHEMA, LevelResult
from clockgeo.errors import DataError, OutputError
from clockgeo.files import json_text, write_dataset, write_text

if TYPE_CHECKING:
    import xarray as xr

__all__ = [
    "LEVEL_FILES",
    "prepare_folder",
    "read_result",
    "result_dataset",
    "without_empty",
    "write_result",
]

RESULT_JSON = "result.json"
RESULT_NETCDF = "result.nc"
CORRELATIONS_CSV = "correlations.csv"
LEVEL_FILES = (RESULT_JSON, RESULT_NETCDF, CORRELATIONS_CSV)
"""What `write_result` writes."""


def prepare_folder(folder: str | Path, names: tuple[str, ...], *, replace: bool) -> Path:
    """Make the output folder and refuse, before any work, what could not be written later.

    Raises
    ------
    OutputError
        If the folder cannot be made or written to, or one of `names` exists and `replace` is false.
    """
    target = Path(folder)
    try:
        target.mkdir(parents=True, exist_ok=True)
        probe = target / ".clockgeo.part"
        probe.touch()
        probe.unlink()
    except OSError as error:
        raise OutputError(
            f"cannot write to the output folder ({error.strerror})",
            value=target,
            advice="Choose another with --out",
        ) from error
    present = [name for name in names if (target / name).exists()]
    if present and not replace:
        raise OutputError(
            "results exist already",
            value=", ".join(present),
            where=str(target),
            advice="Choose another folder with --out, or allow replacing them with --force",
        )
    return target


def write_result(result: LevelResult, folder: Path, *, replace: bool = False) -> list[Path]:
    """Write `LEVEL_FILES` into `folder`; return their paths.

    Raises
    ------
    OutputError
        If a file cannot be written, or exists and `replace` is false.
    """
    write_text(folder / RESULT_JSON, json_text(result), replace=replace)
    dataset = with_correlations(result_dataset(result), result)
    write_dataset(folder / RESULT_NETCDF, without_empty(dataset), replace=replace, classic=True)
    write_text(folder / CORRELATIONS_CSV, correlations_csv(result), replace=replace)
    return [folder / name for name in LEVEL_FILES]


def read_result(path: str | Path) -> LevelResult | AdjustResult:
    """Read a `result.json` back, checked against the schema it names.

    Raises
    ------
    DataError
        If the file is missing or is no result of clockgeo.
    """
    from pydantic import ValidationError

    path = Path(path)
    path = path / RESULT_JSON if path.is_dir() else path
    try:
        content = path.read_bytes()
        schema = json.loads(content).get("schema")
    except FileNotFoundError:
        raise DataError(
            "no result here", value=path, advice="Run clockgeo level or adjust with --out first"
        ) from None
    except (ValueError, AttributeError):
        raise DataError("not a JSON object", where=str(path)) from None
    kinds: dict[str, type[LevelResult | AdjustResult]] = {
        LEVEL_SCHEMA: LevelResult,
        ADJUST_SCHEMA: AdjustResult,
    }
    if schema not in kinds:
        raise DataError(
            "not a result of this version of clockgeo",
            value=f"schema {schema!r}",
            where=str(path),
            allowed=f"Schemas {', '.join(kinds)}",
        )
    try:
        return kinds[schema].model_validate_json(content)
    except ValidationError as error:
        first = error.errors()[0]
        raise DataError(
            "the result does not follow its schema",
            value=f"{'.'.join(map(str, first['loc']))}: {first['msg']}",
            where=str(path),
        ) from None


def result_dataset(result: LevelResult | AdjustResult) -> xr.Dataset:
    """Return the result as an xarray dataset that follows the CF conventions."""
    import xarray as xr

    conventions = result.conventions
    number_attributes = {
        "units": "m2 s-2",
        "long_name": "geopotential number of the marker",
        "zero_level": conventions.zero_level,
        "zero_level_potential": conventions.w0,
        "tide_system": conventions.tide_system.value,
        "ancillary_variables": "u_geopotential_number",
    }
    sites, sessions = result.sites, result.sessions
    at_site = [
        ("geopotential_number", [s.geopotential_number for s in sites], number_attributes),
        ("u_geopotential_number", [s.u for s in sites], _u("m2 s-2", "geopotential number")),
    ]
    for kind in ("normal", "orthometric", "dynamic"):
        heights = [getattr(site.heights, kind) for site in sites]
        values = [np.nan if h is None else h.value for h in heights]
        u = [np.nan if h is None or h.u is None else h.u for h in heights]
        at_site += [
            (f"{kind}_height", values, {"units": "m", "long_name": f"{kind} height"}),
            (f"u_{kind}_height", u, _u("m", f"{kind} height")),
        ]
    of_session = [
        (name, [getattr(s, name) for s in sessions], {"units": unit, "long_name": words})
        for name, unit, words in (
            ("y", "1", "mean fractional frequency, numerator over denominator"),
            ("u_statistical", "1", "standard uncertainty of y from statistics"),
            ("u_systematic", "1", "standard uncertainty of y from systematic effects"),
            ("u_scatter", "1", "standard uncertainty of y from excess scatter between sessions"),
            ("u", "1", "standard uncertainty of y"),
            ("uptime", "1", "share of valid time"),
            ("tide_correction", "1", "mean tide correction included in y"),
        )
    ]
    variables: dict[str, Any] = {name: ("site", values, attrs) for name, values, attrs in at_site}
    variables |= {name: ("session", values, attrs) for name, values, attrs in of_session}
    variables["covariance"] = (
        ("site", "other_site"),
        np.array(result.covariance.matrix).reshape(len(sites), len(sites)),
        {"units": "m4 s-4", "long_name": "covariance of the geopotential numbers"},
    )
    coordinates = {
        "site": ("site", [site.id for site in sites], {"long_name": "site"}),
        "other_site": ("other_site", list(result.covariance.order), {"long_name": "site"}),
        "session": ("session", [s.id for s in sessions], {"long_name": "session"}),
        "latitude": (
            "site",
            [site.latitude for site in sites],
            {"units": "degrees_north", "standard_name": "latitude"},
        ),
        "longitude": (
            "site",
            [site.longitude for site in sites],
            {"units": "degrees_east", "standard_name": "longitude"},
        ),
    }
    dataset = xr.Dataset(
        variables,
        coordinates,
        {
            "Conventions": "CF-1.12",
            "title": result.name,
            "source": f"clockgeo {result.provenance.version}",
            "comment": f"{conventions.sign} {conventions.caution}",
            "schema": result.schema_name,
        },
    )
    return without_empty(dataset)


def without_empty(dataset: xr.Dataset) -> xr.Dataset:
    """Return the dataset without tables of no rows: in classic netCDF their size means another."""
    return dataset.drop_dims([name for name, size in dataset.sizes.items() if size == 0])


def _u(unit: str, of: str) -> dict[str, str]:
    return {"units": unit, "long_name": f"standard uncertainty of the {of}"}
