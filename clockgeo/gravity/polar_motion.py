"""The pole tide: the centrifugal potential wanders with the rotation pole."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.constants import EARTH_ROTATION_RATE
from clockgeo.errors import DataError
from clockgeo.gravity.normal_field import cartesian
from clockgeo.gravity.places import Place
from clockgeo.gravity.text_tables import number, read_rows
from clockgeo.gravity.tides import LoveNumbers
from clockgeo.times import DAY_NS, iso_utc, mjd_utc, tai_from_iso, tai_from_mjd_utc

__all__ = ["POLE_LOVE_NUMBERS", "PoleCoordinates", "pole_tide", "read_pole_coordinates"]

POLE_LOVE_NUMBERS = LoveNumbers(
    0.3077, 0.6207, "Love numbers of the pole tide, IERS Conventions 2010, ch. 6 and 7"
)
_ARCSECOND = np.pi / 648_000.0
_EPOCH_2000_MJD, _YEAR_DAYS = 51_544.0, 365.25
_SECULAR_X = (0.0550, 0.001677)  # arcsec, arcsec a-1; IERS Conventions, update of 2018
_SECULAR_Y = (0.3205, 0.003460)
_LARGEST = 1.0  # arcsec; the pole has stayed within 0.8 since it is observed


@dataclass(frozen=True)
class PoleCoordinates:
    """Observed coordinates of the rotation pole over time.

    Attributes
    ----------
    tai_ns : int64 array, shape (N,)
        Increasing epochs in TAI nanoseconds since 1958; at least two.
    x, y : array, shape (N,)
        Pole coordinates in arcseconds, y positive towards 90° west.

    Raises
    ------
    DataError
        If epochs do not increase, or a coordinate is above 1 arcsecond.
    """

    tai_ns: NDArray[np.int64]
    x: NDArray[np.float64]
    y: NDArray[np.float64]

    def __post_init__(self) -> None:
        if len(self.tai_ns) < 2 or np.any(np.diff(self.tai_ns) <= 0):
            raise DataError("pole coordinates need at least two epochs in increasing order")
        largest = float(np.max(np.abs([self.x, self.y])))
        if not largest <= _LARGEST:
            raise DataError(
                "pole coordinate out of range",
                value=largest,
                allowed="Arcseconds, at most 1",
                advice="If the values are in milliarcseconds, divide them by 1000",
            )

    def at(self, tai_ns: ArrayLike) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Interpolate linearly; daily values then err by less than 1e-4 arcsecond.

        Raises
        ------
        DataError
            If an epoch lies outside the table.
        """
        epochs = np.asarray(tai_ns, dtype=np.int64)
        first, last = int(self.tai_ns[0]), int(self.tai_ns[-1])
        outside = (epochs < first) | (epochs > last)
        if np.any(outside):
            raise DataError(
                "the pole coordinates do not cover the record",
                value=iso_utc(int(np.extract(outside, epochs)[0])),
                allowed=f"{iso_utc(first)} to {iso_utc(last)}",
                advice="Give a longer table of pole coordinates",
            )
        known = (self.tai_ns - first) / DAY_NS
        wanted = (epochs - first) / DAY_NS
        return np.interp(wanted, known, self.x), np.interp(wanted, known, self.y)


def pole_tide(tai_ns: ArrayLike, place: Place, pole: PoleCoordinates) -> NDArray[np.float64]:
    """Change of the potential that a clock on the solid Earth feels from polar motion.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds since 1958.
    place : Place
    pole : PoleCoordinates

    Returns
    -------
    array, shape (N,)
        m² s⁻², counted from the secular pole; at most 0.1 (1.2e-18).

    Notes
    -----
    dW = -(Ω² r²/2) sin 2θ (m1 cos λ + m2 sin λ)(1 + k2 - h2) with m1 = xp - xs, m2 = -(yp - ys),
    geocentric colatitude θ and the linear secular pole of 2018. IERS Conventions 2010, sections
    7.1.4. The oceans' pole tide (below 0.01 m² s⁻²) is left out.
    """
    epochs = np.asarray(tai_ns, dtype=np.int64)
    xp, yp = pole.at(epochs)
    years = (mjd_utc(epochs) - _EPOCH_2000_MJD) / _YEAR_DAYS
    m1 = (xp - (_SECULAR_X[0] + _SECULAR_X[1] * years)) * _ARCSECOND
    m2 = -(yp - (_SECULAR_Y[0] + _SECULAR_Y[1] * years)) * _ARCSECOND
    x, y, z = cartesian(place.latitude, place.longitude, place.ellipsoidal_height)
    # r² sin 2θ (m1 cos λ + m2 sin λ) = 2 z (m1 x + m2 y)
    direct = -(EARTH_ROTATION_RATE.value**2) * z * (m1 * x + m2 * y)
    return np.asarray(direct * POLE_LOVE_NUMBERS.on_crust)


def read_pole_coordinates(path: str | Path) -> PoleCoordinates:
    """Read pole coordinates from a comma-separated table.

    Parameters
    ----------
    path : path
        Columns ``epoch_utc`` (Modified Julian Date or ISO 8601), ``x_arcsec``, ``y_arcsec``; lines
        that start with ``#`` are comments.

    Raises
    ------
    DataError
        If the file is no such table; names the lines.
    """
    rows = read_rows(path, _epoch_row, required=("epoch_utc", "x_arcsec", "y_arcsec"))
    epochs, x, y = zip(*rows, strict=True)
    try:
        return PoleCoordinates(np.array(epochs, dtype=np.int64), np.array(x), np.array(y))
    except DataError as error:
        raise DataError(
            error.what,
            value=error.value,
            where=Path(path).name,
            allowed=error.allowed,
            advice=error.advice,
        ) from None


def _epoch_row(row: dict[str, str]) -> tuple[int, float, float]:
    text = row["epoch_utc"]
    if "-" in text[1:]:
        epoch = tai_from_iso(text)
    else:
        mjd = number(row, "epoch_utc")
        epoch = int(tai_from_mjd_utc(int(mjd // 1), round(mjd % 1 * DAY_NS)))
    return epoch, number(row, "x_arcsec"), number(row, "y_arcsec")
