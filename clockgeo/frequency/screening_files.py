"""Files around screening: rules in, verdicts on every epoch out (CSV, JSON, CF netCDF)."""

from __future__ import annotations

import csv
import io
import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
from pydantic import ValidationError

from clockgeo.errors import DataError
from clockgeo.files import json_text, netcdf_file, whole_file, write_text
from clockgeo.frequency.diagnosis import Finding
from clockgeo.frequency.netcdf_rows import TIME_VARIABLE, VALUE_VARIABLE
from clockgeo.frequency.netcdf_writing import write_time
from clockgeo.frequency.screening import Reason, Screening, ScreeningRules
from clockgeo.times import iso_utc

__all__ = ["read_screening_rules", "screening_object", "write_screening"]

_CSV_HEADER = ("record", "time (UTC)", "y (1)", "reasons")


def read_screening_rules(path: Path) -> ScreeningRules:
    """Read rules from a TOML file, alone or under `[screening]`.

    Raises
    ------
    DataError
        If the file is missing or no TOML, or a rule is unknown or out of its range.
    """
    try:
        document = tomllib.loads(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise DataError(
            "cannot read the screening rules", value=str(error), where=str(path)
        ) from None
    try:
        return ScreeningRules.model_validate(document.get("screening", document))
    except ValidationError as error:
        told = "; ".join(
            f"{'.'.join(map(str, problem['loc']))}: {problem['msg']}" for problem in error.errors()
        )
        raise DataError(
            "the screening rules are wrong",
            value=told,
            where=str(path),
            allowed=f"Keys {', '.join(ScreeningRules.model_fields)}",
        ) from None


def screening_object(
    screenings: Sequence[Screening], findings: Sequence[Sequence[Finding]]
) -> dict[str, Any]:
    """Counts, flagged epochs, means and findings as one object with names that stay.

    Parameters
    ----------
    screenings : sequence of Screening, K items
        One a record.
    findings : sequence of K sequences of Finding
        What `diagnose` told of each record.

    Returns
    -------
    dict
        ``name``, ``counts``, ``epochs``, ``mean`` and more of the one record, or ``records`` with
        such an object for each of several.
    """
    objects = [_one(s, f) for s, f in zip(screenings, findings, strict=True)]
    return objects[0] if len(objects) == 1 else {"records": objects}


def _one(screening: Screening, findings: Sequence[Finding]) -> dict[str, Any]:
    record = screening.record
    return {
        "name": record.name,
        "start": iso_utc(record.start),
        "stop": iso_utc(record.stop),
        "interval": record.interval,
        "rows": len(record),
        "valid": int(np.count_nonzero(screening.valid)),
        "counts": screening.counts,
        "mean": {"with": screening.mean_with, "without": screening.mean_without},
        "epochs": [
            {"time": time, "y": y, "reasons": reasons.split(", ")}
            for time, y, reasons in _flagged(screening)
        ],
        "findings": [
            {**vars(finding), "time": None if finding.tai_ns is None else iso_utc(finding.tai_ns)}
            for finding in findings
        ],
        "notes": [*record.notes, *screening.notes],
        "sources": record.sources,
    }


def _flagged(screening: Screening) -> list[tuple[str, float, str]]:
    """Time, value and reasons of the epochs that screening flagged."""
    record = screening.record
    return [
        (
            iso_utc(int(record.tai_ns[row])),
            float(record.y[row]),
            Reason(int(screening.reasons[row])).words,
        )
        for row in screening.flagged().tolist()
    ]


def write_screening(
    path: Path,
    screenings: Sequence[Screening],
    findings: Sequence[Sequence[Finding]],
    *,
    replace: bool = False,
) -> None:
    """Write the verdicts; the ending of `path` decides how.

    ``.csv`` holds one line per flagged epoch, ``.json`` the object of `screening_object`, ``.nc``
    every epoch of one record with CF flags.

    Raises
    ------
    DataError
        If the ending is another one, or several records go into one netCDF file.
    OutputError
        If the file exists or cannot be written.
    """
    kind = path.suffix.lower()
    if kind == ".csv":
        write_text(path, _csv(screenings), replace=replace)
    elif kind == ".json":
        content = {"schema": "clockgeo/screen/1", **screening_object(screenings, findings)}
        write_text(path, json_text(content), replace=replace)
    elif kind == ".nc":
        if len(screenings) != 1:
            raise DataError(
                "a netCDF file holds the verdicts on one record",
                value=f"{len(screenings)} records",
                advice="Screen one record at a time, or write .csv or .json",
            )
        with whole_file(path, replace=replace) as partial:
            _write_netcdf(partial, screenings[0])
    else:
        raise DataError(
            "cannot tell the kind of file from its ending",
            value=path.name,
            allowed=".csv, .json or .nc",
        )


def _csv(screenings: Sequence[Screening]) -> str:
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(_CSV_HEADER)
    for screening in screenings:
        for time, y, reasons in _flagged(screening):
            writer.writerow([screening.record.name, time, repr(y), reasons])
    return text.getvalue()


def _write_netcdf(path: Path, screening: Screening) -> None:
    record = screening.record
    with netcdf_file(path) as dataset:
        dataset.Conventions = "CF-1.12"
        dataset.title = f"Screening of the frequency record {record.name}"
        dataset.interval = record.interval
        dataset.mean_with_screening = screening.mean_with
        dataset.mean_without_screening = screening.mean_without
        write_time(dataset, TIME_VARIABLE, record.tai_ns, stamp="start")
        y = dataset.createVariable(VALUE_VARIABLE, "f8", (TIME_VARIABLE,))
        y.setncatts(
            {
                "long_name": "fractional frequency deviation from the nominal value",
                "units": "1",
                "ancillary_variables": "reasons",
            }
        )
        y[:] = record.y
        reasons = dataset.createVariable("reasons", "u1", (TIME_VARIABLE,))
        reasons.setncatts(
            {
                "standard_name": "status_flag",
                "long_name": "why the epoch does not count; 0 where it counts",
                "flag_masks": np.array([int(reason) for reason in Reason], dtype=np.uint8),
                "flag_meanings": " ".join(reason.words for reason in Reason),
            }
        )
        reasons[:] = screening.reasons
