"""Ocean and other loading from harmonic coefficients that the user supplies.

A table belongs to one place. Each constituent has a height part (uplift of the crust) and a
potential part (attraction of the moved masses and of the deformation, at a fixed point), since a
clock feels both: W changes by the potential part minus g times the uplift.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray
from pydantic import Field, ValidationError

from clockgeo.constants import STANDARD_GRAVITY
from clockgeo.errors import DataError
from clockgeo.gravity.text_tables import number, read_rows
from clockgeo.tables import Identifier, NonNegative, Table, Uncertainty
from clockgeo.times import tt_julian_date, utc_julian_date

__all__ = [
    "Constituent",
    "LoadTable",
    "doodson_argument",
    "read_load_table",
    "uplift_difference",
    "write_load_table",
]

_REQUIRED = (
    "constituent",
    "doodson",
    "offset_deg",
    "height_amplitude_m",
    "height_phase_deg",
    "potential_amplitude_m2_s2",
    "potential_phase_deg",
)
_OPTIONAL = ("u_height_m", "u_potential_m2_s2")
_WORDS = ("constituent", "doodson")


class Constituent(Table):
    """One wave of a loading table.

    The wave is amplitude · cos(χ + offset - phase) with the Doodson argument χ at Greenwich.
    """

    constituent: Identifier
    """Name of the wave, such as M2."""
    doodson: str = Field(pattern=r"^[0-9]{3}\.[0-9]{3}$")
    """Doodson number: multiples of τ, s, h, p, N', p_s; all but the first increased by 5."""
    offset_deg: float = 0.0
    """Added to the argument so that phases are Greenwich lags; 0 for M2, 90 for K1, -90 for O1."""
    height_amplitude_m: NonNegative
    """Uplift of the crust, m."""
    height_phase_deg: float
    potential_amplitude_m2_s2: NonNegative
    """Change of W at a fixed point, m² s⁻²."""
    potential_phase_deg: float
    u_height_m: Uncertainty = 0.0
    u_potential_m2_s2: Uncertainty = 0.0


class LoadTable(Table):
    """Harmonic loading of one place."""

    constituents: tuple[Constituent, ...] = Field(min_length=1)
    gravity: float = Field(default=STANDARD_GRAVITY.value, ge=9.7, le=9.9)
    """Gravity of the place in m s⁻², which turns uplift into potential."""

    def potential(self, tai_ns: ArrayLike) -> NDArray[np.float64]:
        """Change of the potential a clock on the crust feels, m² s⁻², shape (N,)."""
        total = np.zeros(np.shape(tai_ns))
        for wave in self.constituents:
            argument = doodson_argument(tai_ns, wave.doodson) + np.radians(wave.offset_deg)
            masses = np.cos(argument - np.radians(wave.potential_phase_deg))
            uplift = np.cos(argument - np.radians(wave.height_phase_deg))
            total += wave.potential_amplitude_m2_s2 * masses
            total -= self.gravity * wave.height_amplitude_m * uplift
        return total

    @property
    def u(self) -> float:
        """Standard uncertainty of the amplitude of the sum, waves independent; m² s⁻²."""
        parts = [
            np.hypot(wave.u_potential_m2_s2, self.gravity * wave.u_height_m)
            for wave in self.constituents
        ]
        return float(np.linalg.norm(parts))


def doodson_argument(tai_ns: ArrayLike, doodson: str) -> NDArray[np.float64]:
    """Astronomical argument of a wave at Greenwich, in radians.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds since 1958.
    doodson : str
        Doodson number such as ``"255.555"``.

    Notes
    -----
    χ = n1 τ + n2 s + n3 h + n4 p + n5 N' + n6 p_s with s = F + Ω, h = s - D, p = s - l, N' = -Ω,
    p_s = h - l' and τ = GMST + π - s from the fundamental arguments of the IERS Conventions 2003.
    """
    epochs = np.asarray(tai_ns, dtype=np.int64)
    first, second = tt_julian_date(epochs)
    centuries = (first - erfa.DJ00 + second) / erfa.DJC
    moon_anomaly, sun_anomaly = erfa.fal03(centuries), erfa.falp03(centuries)
    node, elongation = erfa.faom03(centuries), erfa.fad03(centuries)
    s = erfa.faf03(centuries) + node
    h = s - elongation
    tau = erfa.gmst06(*utc_julian_date(epochs), first, second) + np.pi - s
    arguments = (tau, s, h, s - moon_anomaly, -node, h - sun_anomaly)
    digits = [int(digit) for digit in doodson.replace(".", "")]
    multiples = [digits[0], *(digit - 5 for digit in digits[1:])]
    return np.asarray(sum(n * angle for n, angle in zip(multiples, arguments, strict=True)))


def read_load_table(path: str | Path, *, gravity: float | None = None) -> LoadTable:
    """Read the harmonic loading of one place from CSV or netCDF (by the suffix ``.nc``).

    Parameters
    ----------
    path : path
        Columns (CSV) or variables on one dimension (netCDF) ``constituent, doodson, offset_deg,
        height_amplitude_m, height_phase_deg, potential_amplitude_m2_s2, potential_phase_deg``, and
        if known ``u_height_m, u_potential_m2_s2``. Lines that start with ``#`` are comments.
    gravity : float, optional
        Gravity of the place in m s⁻²; standard gravity without it (0.3 % of the uplift part).

    Raises
    ------
    DataError
        If the file is no such table; names the file, the lines and the fields.
    """
    source = Path(path)
    if source.suffix == ".nc":
        waves = [_constituent(row) for row in _netcdf_rows(source)]
    else:
        waves = read_rows(source, _csv_constituent, required=_REQUIRED, optional=_OPTIONAL)
    names = [wave.constituent for wave in waves]
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise DataError("constituents given twice", value=", ".join(twice), where=source.name)
    if gravity is None:
        return LoadTable(constituents=tuple(waves))
    return LoadTable(constituents=tuple(waves), gravity=gravity)


def write_load_table(table: LoadTable, path: str | Path, *, replace: bool = False) -> None:
    """Write a loading table as CSV, or as netCDF if the suffix is ``.nc``; whole or not at all."""
    from clockgeo.files import write_dataset, write_text

    columns = (*_REQUIRED, *_OPTIONAL)
    rows = [[getattr(wave, column) for column in columns] for wave in table.constituents]
    if Path(path).suffix != ".nc":
        lines = [",".join(columns), *(",".join(str(cell) for cell in row) for row in rows)]
        write_text(path, "\n".join(lines) + "\n", replace=replace)
        return
    import xarray

    data = {
        name: ("wave", np.array(values, dtype=object if name in _WORDS else np.float64))
        for name, values in zip(columns, zip(*rows, strict=True), strict=True)
    }
    dataset = xarray.Dataset(data, attrs={"title": "harmonic loading of one place"})
    write_dataset(path, dataset, replace=replace)


def uplift_difference(rate: float, years: float, *, gravity: float) -> float:
    """Growth of C in m² s⁻² of a mark that rises steadily: gravity · rate · years.

    Parameters
    ----------
    rate : float
        Uplift in m a⁻¹, positive up.
    years : float
        Time since the epoch of the height, a.
    gravity : float
        m s⁻².

    Notes
    -----
    1 mm a⁻¹ is 1.09e-19 a⁻¹ in fractional frequency. The attraction of the moved masses, two to
    three orders smaller, is left out (Bondarescu et al. 2015).
    """
    from clockgeo.gravity.places import checked_gravity

    return float(checked_gravity(gravity)) * rate * years


def _csv_constituent(row: dict[str, str]) -> Constituent:
    values: dict[str, Any] = {name: row[name] for name in _WORDS}
    for name in row:
        if name not in _WORDS:
            values[name] = number(row, name)
    return _constituent(values)


def _constituent(values: dict[str, Any]) -> Constituent:
    try:
        return Constituent(**values)
    except ValidationError as error:
        first = error.errors()[0]
        field = ".".join(str(part) for part in first["loc"])
        raise DataError(
            f"constituent {values.get('constituent')}: {field} is wrong",
            value=repr(first["input"]),
            allowed=first["msg"],
        ) from None


def _netcdf_rows(path: Path) -> list[dict[str, Any]]:
    import xarray

    try:
        with xarray.open_dataset(path) as dataset:
            dataset.load()
    except FileNotFoundError:
        raise
    except (OSError, ValueError) as error:
        raise DataError("not a netCDF file", where=path.name, advice=str(error)) from None
    missing = [name for name in _REQUIRED if name not in dataset.variables]
    if missing:
        raise DataError("missing variables", value=", ".join(missing), where=path.name)
    names = [name for name in (*_REQUIRED, *_OPTIONAL) if name in dataset.variables]
    shapes = {dataset[name].shape for name in names}
    if len(shapes) != 1 or len(next(iter(shapes))) != 1:
        raise DataError("variables must share one dimension", where=path.name)
    columns = {name: dataset[name].values for name in names}
    return [
        {name: str(v[row]) if name in _WORDS else float(v[row]) for name, v in columns.items()}
        for row in range(dataset[names[0]].size)
    ]
