"""Stability as one object, and in files: CSV, JSON, netCDF."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from clockgeo.errors import DataError, OutputError
from clockgeo.files import json_text, netcdf_file, whole_file, write_text
from clockgeo.frequency.deviations import StabilityCurve
from clockgeo.frequency.noise import NoiseModel
from clockgeo.frequency.power_law_fit import PowerLawFit
from clockgeo.frequency.stability import RecordStability
from clockgeo.frequency.stability_statistics import find_statistic
from clockgeo.times import iso_utc

__all__ = ["SCHEMA", "checked_stability_file", "stability_object", "write_stability"]

SCHEMA = "clockgeo/stability/1"
_KINDS = (".csv", ".json", ".nc")
_COLUMNS = ("tau", "deviation", "lower", "upper", "edf", "noise", "count")
_CSV_HEADER = (
    "record",
    "statistic",
    "tau (s)",
    "deviation",
    "lower",
    "upper",
    "edf (1)",
    "noise",
    "count (1)",
    "unit",
)


def checked_stability_file(path: Path, *, records: int, replace: bool) -> None:
    """Refuse a file that could not be written later.

    Raises
    ------
    DataError
        If the ending is unknown, or a netCDF file is to hold several records.
    OutputError
        If the file exists and may not be replaced.
    """
    if path.suffix.lower() not in _KINDS:
        raise DataError(
            "cannot tell the kind of file from its ending",
            value=path.name,
            allowed=".csv, .json or .nc",
        )
    if path.suffix.lower() == ".nc" and records != 1:
        raise DataError(
            "a netCDF file holds the stability of one record",
            value=f"{records} records",
            advice="Take one record at a time, or write .csv or .json",
        )
    if path.exists() and not replace:
        raise OutputError(
            "the output exists already", value=path, advice="Choose another name, or use --force"
        )


def stability_object(
    results: Sequence[RecordStability], dead_times: Sequence[dict[str, Any]] | None = None
) -> dict[str, Any]:
    """Curves, noise model and mean as one object with names that stay.

    Parameters
    ----------
    results : sequence of RecordStability, K items
    dead_times : sequence of K dict, optional
        What extrapolation over downtime adds, of each record.

    Returns
    -------
    dict
        `curves`, `noise_model`, `mean` and more of the one record, or `records` with such an
        object for each of several.
    """
    objects = [_one(result) for result in results]
    for place, dead_time in enumerate(dead_times or ()):
        objects[place]["dead_time"] = dead_time
    return objects[0] if len(objects) == 1 else {"records": objects}


def _one(result: RecordStability) -> dict[str, Any]:
    record = result.record
    return {
        "name": record.name,
        "start": iso_utc(record.start),
        "stop": iso_utc(record.stop),
        "interval": record.interval,
        "weighting": record.weighting,
        "curves": [_curve(curve) for curve in result.curves],
        "noise_model": _model(result.model),
        "noise_laws": _laws(result.laws),
        "noise_fit": None
        if result.fit is None
        else {name: value for name, value in vars(result.fit).items() if name not in ("model",)},
        "mean": result.mean,
        "findings": [
            {**vars(finding), "time": None if finding.tai_ns is None else iso_utc(finding.tai_ns)}
            for finding in result.findings
        ],
        "notes": result.notes,
        "sources": record.sources,
    }


def _curve(curve: StabilityCurve) -> dict[str, Any]:
    return {
        "statistic": curve.statistic,
        "level": curve.level,
        "points": [
            {**dict(zip(_COLUMNS, row, strict=True)), "partial": bool(partial)}
            for row, partial in zip(_rows(curve), curve.partial, strict=True)
        ],
    }


def _rows(curve: StabilityCurve) -> list[tuple[Any, ...]]:
    return list(zip(*(_listed(getattr(curve, name)) for name in _COLUMNS), strict=True))


def _listed(column: Any) -> list[Any]:
    return list(column.tolist() if isinstance(column, np.ndarray) else column)


def _model(model: NoiseModel | None) -> dict[str, float | None]:
    """Levels of the laws; None where a law is absent."""
    names = NoiseModel.model_fields
    return {name: (getattr(model, name) or None) if model else None for name in names}


def _laws(laws: PowerLawFit | None) -> dict[str, Any] | None:
    """How well the levels of the noise model are known, and what else was tried."""
    if laws is None:
        return None
    return {
        "u": laws.u,
        "order": laws.laws,
        "covariance_of_squares": laws.covariance.tolist(),
        "information": laws.information,
        "short_times": laws.short_times,
        "from_seconds": laws.from_seconds,
    }


def write_stability(
    path: Path,
    results: Sequence[RecordStability],
    *,
    dead_times: Sequence[dict[str, Any]] | None = None,
    replace: bool = False,
) -> None:
    """Write the result; the ending of `path` decides how.

    ``.csv`` holds one line a point, ``.json`` the object of `stability_object`, ``.nc`` the curves
    of one record with the noise model as attributes.

    Raises
    ------
    DataError
        If the ending is another one, or several records go into one netCDF file.
    OutputError
        If the file exists or cannot be written.
    """
    checked_stability_file(path, records=len(results), replace=replace)
    kind = path.suffix.lower()
    if kind == ".csv":
        write_text(path, _csv(results), replace=replace)
    elif kind == ".json":
        content = {"schema": SCHEMA, **stability_object(results, dead_times)}
        write_text(path, json_text(content), replace=replace)
    else:
        with whole_file(path, replace=replace) as partial:
            _write_netcdf(partial, results[0])


def _csv(results: Sequence[RecordStability]) -> str:
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(_CSV_HEADER)
    for result in results:
        for curve in result.curves:
            for row in _rows(curve):
                shown = [repr(value) if isinstance(value, float) else value for value in row]
                writer.writerow([result.record.name, curve.statistic, *shown, _unit(curve)])
    return text.getvalue()


def _unit(curve: StabilityCurve) -> str:
    return "s" if find_statistic(curve.statistic).in_time else "1"


def _write_netcdf(path: Path, result: RecordStability) -> None:
    with netcdf_file(path) as dataset:
        dataset.Conventions = "CF-1.12"
        dataset.title = f"Stability of the frequency record {result.record.name}"
        dataset.interval = result.record.interval
        dataset.mean = result.mean.y
        dataset.u_of_mean = result.mean.u
        for name, value in _model(result.model).items():
            if value is not None:
                dataset.setncattr(f"noise_model_{name}", value)
        for curve in result.curves:
            _write_curve(dataset, curve)


def _write_curve(dataset: Any, curve: StabilityCurve) -> None:
    name = curve.statistic.replace("-", "_")
    axis = f"tau_{name}"
    dataset.createDimension(axis, len(curve.tau))
    time = dataset.createVariable(axis, "f8", (axis,))
    time.setncatts({"long_name": "averaging time", "units": "s"})
    time[:] = curve.tau
    words = {
        "deviation": ("", f"{curve.statistic} deviation", _unit(curve)),
        "lower": ("_lower", f"lower end of the interval at {curve.level:g}", _unit(curve)),
        "upper": ("_upper", f"upper end of the interval at {curve.level:g}", _unit(curve)),
        "edf": ("_edf", "equivalent degrees of freedom", "1"),
        "count": ("_count", "squares averaged", "1"),
    }
    for column, (ending, long_name, unit) in words.items():
        kind = "i8" if column == "count" else "f8"
        variable = dataset.createVariable(name + ending, kind, (axis,))
        variable.setncatts({"long_name": long_name, "units": unit})
        variable[:] = getattr(curve, column)
    noise = dataset.createVariable(f"{name}_noise", str, (axis,))
    noise.long_name = "ruling power law"
    for place, law in enumerate(curve.noise):
        noise[place] = law
