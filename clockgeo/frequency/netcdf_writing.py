"""CF netCDF of a record: time in TAI nanoseconds, values with units, flags with meanings."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from clockgeo.files import netcdf_file
from clockgeo.frequency.layout import RecordLayout
from clockgeo.frequency.netcdf_rows import TIME_VARIABLE, VALUE_VARIABLE

__all__ = ["write_netcdf", "write_time"]

_UNITS = {"fractional": "1", "ratio": "1", "offset": "Hz"}
_NAMES = {
    "fractional": "fractional frequency deviation from the nominal value",
    "ratio": "frequency ratio, decimal text",
    "offset": "frequency offset from the nominal value",
}


def write_netcdf(path: Path, columns: dict[str, Any], layout: RecordLayout) -> None:
    """Write the columns of a record as CF-1.12 netCDF-4.

    Parameters
    ----------
    path : Path
        Where to write.
    columns : mapping
        ``time`` (TAI ns, int64), ``value``, and where the layout has them ``flag`` (bool) and
        ``u``; all of shape (N,).
    layout : RecordLayout
        Names of the variables; ``time`` and ``fractional_frequency`` where it gives numbers.
    """
    with netcdf_file(path) as dataset:
        dataset.Conventions = "CF-1.12"
        dataset.title = "Frequency record"
        for key in ("interval", "weighting"):
            if getattr(layout, key) is not None:
                dataset.setncattr(key, getattr(layout, key))
        dataset.stamp = layout.stamp
        dimension = _name(layout, "time", TIME_VARIABLE)
        write_time(dataset, dimension, columns["time"], stamp=layout.stamp)
        value = _name(layout, "value", VALUE_VARIABLE)
        kind = str if columns["value"].dtype == object else "f8"
        variable = dataset.createVariable(value, kind, (dimension,))
        variable.setncatts({"long_name": _NAMES[layout.value], "units": _UNITS[layout.value]})
        variable[:] = columns["value"]
        ancillary = []
        if "u" in columns:
            ancillary.append(_name(layout, "u", f"{value}_u"))
            u = dataset.createVariable(ancillary[-1], "f8", (dimension,))
            u.setncatts({"long_name": "standard uncertainty", "units": _UNITS[layout.value]})
            u[:] = columns["u"]
        if "flag" in columns:
            ancillary.append(_name(layout, "flag", "usable"))
            _write_flags(dataset, ancillary[-1], dimension, columns["flag"], layout)
        if ancillary:
            variable.ancillary_variables = " ".join(ancillary)


def write_time(dataset: Any, name: str, tai_ns: NDArray[np.int64], *, stamp: str) -> None:
    """Write a CF time coordinate, and its dimension, that counts every nanosecond of TAI.

    Parameters
    ----------
    dataset : netCDF4.Dataset
        Open for writing.
    name : str
        Of the dimension and the coordinate.
    tai_ns : int64 array, shape (N,)
        TAI ns since 1958.
    stamp : str
        Which instant of the averaging interval this is.
    """
    dataset.createDimension(name, tai_ns.size)
    time = dataset.createVariable(name, "i8", (name,))
    time.setncatts(
        {
            "standard_name": "time",
            "long_name": f"{stamp} of the averaging interval",
            "units": "nanoseconds since 1958-01-01T00:00:00",
            "calendar": "tai",
            "axis": "T",
        }
    )
    time[:] = tai_ns


def _name(layout: RecordLayout, role: str, default: str) -> str:
    column = getattr(layout, f"{role}_column")
    return column if isinstance(column, str) else default


def _write_flags(dataset: Any, name: str, dimension: str, flags: Any, layout: RecordLayout) -> None:
    valid = int(layout.valid_flags[0])
    other = next(flag for flag in range(128) if str(flag) not in map(str, layout.valid_flags))
    variable = dataset.createVariable(name, "i1", (dimension,))
    low, high = sorted([(other, "not_usable"), (valid, "usable")])
    variable.setncatts(
        {
            "standard_name": "status_flag",
            "long_name": "whether the row may be used",
            "flag_values": np.array([low[0], high[0]], dtype=np.int8),
            "flag_meanings": f"{low[1]} {high[1]}",
        }
    )
    variable[:] = np.where(flags, valid, other).astype(np.int8)
