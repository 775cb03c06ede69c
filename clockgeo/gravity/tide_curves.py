"""The tide of a place, or of one place minus another, as a series, in memory and in files."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.files import write_dataset, write_text
from clockgeo.gravity.tide_model import SiteTide
from clockgeo.gravity.tides import sky_positions, tidal_potential_from
from clockgeo.times import DAY_NS, SECOND_NS, iso_utc, utc_julian_date

if TYPE_CHECKING:
    import xarray

__all__ = ["TideSeries", "series_suffix", "tide_series", "write_tide_series"]

_LARGEST = 5_000_000
_JULIAN_1970 = 2_440_587.5


@dataclass(frozen=True)
class TideSeries:
    """Tide over time; of `site`, or of `site` minus `other` where there is one.

    Attributes
    ----------
    site, other : SiteTide, SiteTide or None
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds since 1958.
    potential : array, shape (N,)
        Time-variable part of W on the crust, m² s⁻²; positive lowers the geopotential number.
    generating_potential : array, shape (N,)
        Tide-generating potential, no Love numbers, permanent part included, m² s⁻².
    permanent_potential : float
        The part of `generating_potential` that is permanent, m² s⁻².
    permanent_on_crust : float
        The permanent part a clock feels; not in `potential`, m² s⁻².
    """

    site: SiteTide
    other: SiteTide | None
    tai_ns: NDArray[np.int64]
    potential: NDArray[np.float64]
    generating_potential: NDArray[np.float64]
    permanent_potential: float
    permanent_on_crust: float


def tide_series(
    start: int, stop: int, step: float, site: SiteTide, other: SiteTide | None = None
) -> TideSeries:
    """Tide at evenly spaced epochs, each evaluated exactly.

    Parameters
    ----------
    start, stop : int
        TAI nanoseconds since 1958; `stop` is included if a step ends there.
    step : float
        s, > 0.
    site : SiteTide
    other : SiteTide, optional
        Subtracted from `site`.

    Raises
    ------
    DataError
        If the span is empty or the series would have more than five million epochs.
    """
    if not 0.0 < step < 1e9:
        raise DataError("the step must be positive", value=step, allowed="Seconds, above 0")
    step_ns = round(step * SECOND_NS)
    if stop < start or step_ns < 1:
        raise DataError(
            "the series ends before it starts",
            value=f"{iso_utc(start)} to {iso_utc(stop)}",
            advice="Give --start before --stop, both in UTC",
        )
    count = (stop - start) // step_ns + 1
    if count > _LARGEST:
        raise DataError(
            "the series is too long",
            value=f"{count} epochs",
            allowed=f"At most {_LARGEST} epochs",
            advice="Take a longer step; the tide is smooth over 10 minutes",
        )
    epochs = start + np.arange(count, dtype=np.int64) * step_ns
    sky = sky_positions(epochs)
    potential = site.potential(epochs, sky=sky)
    tide = tidal_potential_from(sky, site.place)
    generating, permanent, felt = tide.generating, tide.permanent, tide.permanent_on_crust
    if other is not None:
        potential = potential - other.potential(epochs, sky=sky)
        tide = tidal_potential_from(sky, other.place)
        generating = generating - tide.generating
        permanent, felt = permanent - tide.permanent, felt - tide.permanent_on_crust
    return TideSeries(site, other, epochs, potential, generating, permanent, felt)


def write_tide_series(
    series: TideSeries,
    path: str | Path,
    *,
    fractional_frequency: NDArray[np.float64] | None = None,
    replace: bool = False,
) -> None:
    """Write a series as CSV, or as CF netCDF if the suffix is ``.nc``; whole or not at all.

    Parameters
    ----------
    series : TideSeries
    path : path
        Name that ends in ``.csv`` or ``.nc``.
    fractional_frequency : array, shape (N,), optional
        What the tide does to a clock, written beside the potential.
    replace : bool
        Whether an existing file may be replaced.

    Raises
    ------
    DataError
        If the suffix is neither ``.csv`` nor ``.nc``.
    OutputError
        If the file exists and `replace` is false, or cannot be written.
    """
    columns = {"potential": series.potential}
    if fractional_frequency is not None:
        columns["fractional_frequency"] = fractional_frequency
    if series_suffix(path) == ".csv":
        write_text(path, _csv(series, columns), replace=replace)
    else:
        write_dataset(path, _dataset(series, columns), replace=replace)


def series_suffix(path: str | Path) -> str:
    """Suffix of a file for a series, ``.csv`` or ``.nc``.

    Raises
    ------
    DataError
        If it is neither; ask before the series is computed.
    """
    suffix = Path(path).suffix.lower()
    if suffix not in (".csv", ".nc"):
        raise DataError(
            "unknown kind of file", value=str(path), allowed="A name that ends in .csv or .nc"
        )
    return suffix


_UNITS = {"potential": "m2 s-2", "fractional_frequency": "1"}
_LONG_NAMES = {
    "potential": "time-variable tidal potential on the crust",
    "fractional_frequency": "fractional frequency of a clock due to the tide",
}


def _csv(series: TideSeries, columns: dict[str, NDArray[np.float64]]) -> str:
    header = ",".join(["utc", *(f"{name} ({_UNITS[name]})" for name in columns)])
    numbers = zip(*(values.tolist() for values in columns.values()), strict=True)
    rows = (
        ",".join([iso_utc(int(epoch)), *(repr(value) for value in row)])
        for epoch, row in zip(series.tai_ns, numbers, strict=True)
    )
    head = [
        f"# {_LONG_NAMES['potential']}, {_title(series)}",
        f"# permanent part, not included: {series.permanent_on_crust!r} m2 s-2",
    ]
    return "\n".join([*head, header, *rows]) + "\n"


def _dataset(series: TideSeries, columns: dict[str, NDArray[np.float64]]) -> xarray.Dataset:
    import xarray

    day, fraction = utc_julian_date(series.tai_ns)
    days = (day - _JULIAN_1970).astype("timedelta64[D]") + np.datetime64("1970-01-01", "ns")
    utc = days + np.rint(fraction * DAY_NS).astype("timedelta64[ns]")
    variables = {
        name: ("time", values, {"units": _UNITS[name], "long_name": _LONG_NAMES[name]})
        for name, values in columns.items()
    }
    exact = {"long_name": "TAI since 1958-01-01T00:00:00 TAI, exact", "units": "nanosecond"}
    dataset = xarray.Dataset(
        {**variables, "tai": ("time", series.tai_ns, exact)},
        coords={"time": ("time", utc, {"standard_name": "time", "long_name": "UTC"})},
        attrs={"Conventions": "CF-1.11", "title": f"tidal potential, {_title(series)}"},
    )
    dataset["potential"].attrs["permanent_part_not_included"] = series.permanent_on_crust
    dataset["tai"].encoding["dtype"] = "int64"
    return dataset


def _title(series: TideSeries) -> str:
    first = _coordinates(series.site)
    return first if series.other is None else f"{first} minus {_coordinates(series.other)}"


def _coordinates(site: SiteTide) -> str:
    place = site.place
    return (
        f"latitude {place.latitude} longitude {place.longitude} height {place.ellipsoidal_height} m"
    )
