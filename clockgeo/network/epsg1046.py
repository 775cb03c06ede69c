"""Vertical Offset and Slope, EPSG coordinate operation method 1046, and its WKT2.

    H_2 = H_1 + A + I_φ ρ0 (φ - φ0) + I_λ ν0 (λ - λ0) cos φ

IOGP Publication 373-7-2, Coordinate Conversions and Transformations including Formulas, "Vertical
Offset and Slope"; WKT after ISO 19162:2019.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.errors import DataError
from clockgeo.gravity.places import checked_latitude, checked_longitude, plain
from clockgeo.network.datum_plane import ways_from

__all__ = ["OffsetAndSlope", "read_wkt", "write_wkt"]

_ARC_SECOND = np.pi / 648_000.0
_PARAMETERS = {
    "Ordinate 1 of evaluation point": (8617, 'ANGLEUNIT["degree",0.0174532925199433]'),
    "Ordinate 2 of evaluation point": (8618, 'ANGLEUNIT["degree",0.0174532925199433]'),
    "Vertical Offset": (8603, 'LENGTHUNIT["metre",1]'),
    "Inclination in latitude": (8730, 'ANGLEUNIT["arc-second",4.84813681109536E-06]'),
    "Inclination in longitude": (8731, 'ANGLEUNIT["arc-second",4.84813681109536E-06]'),
}
"""Parameter -> its EPSG code and unit, in the order of `OffsetAndSlope`."""


@dataclass(frozen=True)
class OffsetAndSlope:
    """Parameters of EPSG method 1046 from one vertical reference to another.

    Attributes
    ----------
    latitude, longitude : float
        Evaluation point, degrees.
    offset : float
        A, m.
    inclination_latitude, inclination_longitude : float
        I_φ and I_λ, arc-seconds.
    """

    latitude: float
    longitude: float
    offset: float
    inclination_latitude: float = 0.0
    inclination_longitude: float = 0.0

    @classmethod
    def from_tilts(
        cls, origin: tuple[float, float], offset: float, tilt_north: float, tilt_east: float
    ) -> OffsetAndSlope:
        """Parameters from an offset in m and tilts in m a metre at an origin in degrees."""
        return cls(*origin, offset, tilt_north / _ARC_SECOND, tilt_east / _ARC_SECOND)

    def shift(self, latitude: ArrayLike, longitude: ArrayLike) -> float | NDArray[np.float64]:
        """H_2 - H_1 in m at points in degrees.

        Raises
        ------
        DataError
            If a coordinate is out of range.

        Examples
        --------
        >>> round(OffsetAndSlope(50.0, 8.0, -0.25, 0.1).shift(50.0, 9.0), 6)
        -0.25
        """
        checked_latitude(latitude), checked_longitude(longitude)
        north, east = ways_from((self.latitude, self.longitude), latitude, longitude)
        slopes = self.inclination_latitude * north + self.inclination_longitude * east
        return plain(self.offset + _ARC_SECOND * slopes)

    @property
    def parameters(self) -> dict[str, float]:
        """Values by the names of the EPSG registry."""
        values = (
            self.latitude,
            self.longitude,
            self.offset,
            self.inclination_latitude,
            self.inclination_longitude,
        )
        return dict(zip(_PARAMETERS, values, strict=True))


def write_wkt(
    operation: OffsetAndSlope,
    *,
    source: str,
    target: str,
    accuracy: float | None = None,
    remark: str = "",
) -> str:
    """WKT2 of the operation between two vertical references that have no code of their own.

    Parameters
    ----------
    operation : OffsetAndSlope
    source, target : str
        Names of the vertical datums.
    accuracy : float, optional
        Accuracy of the operation in m.
    remark : str
        What else belongs to it.

    Returns
    -------
    str
        One COORDINATEOPERATION; coordinates are geographic on GRS80.
    """
    parameters = ",\n    ".join(
        f'PARAMETER["{name}",{value!r},{_PARAMETERS[name][1]},ID["EPSG",{_PARAMETERS[name][0]}]]'
        for name, value in operation.parameters.items()
    )
    rest = "" if accuracy is None else f",\n    OPERATIONACCURACY[{accuracy:.4g}]"
    rest += f",\n    REMARK[{_quoted(remark)}]" if remark else ""
    return (
        f"COORDINATEOPERATION[{_quoted(f'{source} height to {target} height')},\n"
        f"    SOURCECRS[{_vertical(source)}],\n"
        f"    TARGETCRS[{_vertical(target)}],\n"
        '    METHOD["Vertical Offset and Slope",ID["EPSG",1046]],\n'
        f"    {parameters},\n"
        f"    INTERPOLATIONCRS[{_GEOGRAPHIC}]{rest}]\n"
    )


_GEOGRAPHIC = (
    'GEOGCRS["geographic coordinates on GRS 1980",'
    'DATUM["terrestrial reference frame of the observations",'
    'ELLIPSOID["GRS 1980",6378137,298.257222101,LENGTHUNIT["metre",1]]],'
    'PRIMEM["Greenwich",0,ANGLEUNIT["degree",0.0174532925199433]],CS[ellipsoidal,2],'
    'AXIS["geodetic latitude (Lat)",north,ORDER[1],ANGLEUNIT["degree",0.0174532925199433]],'
    'AXIS["geodetic longitude (Lon)",east,ORDER[2],ANGLEUNIT["degree",0.0174532925199433]]]'
)


def _vertical(name: str) -> str:
    axis = 'AXIS["gravity-related height (H)",up,LENGTHUNIT["metre",1]]'
    return f"VERTCRS[{_quoted(f'{name} height')},VDATUM[{_quoted(name)}],CS[vertical,1],{axis}]"


def _quoted(text: str) -> str:
    """Return WKT text: a quote inside is doubled."""
    return '"' + text.replace('"', '""') + '"'


def read_wkt(text: str) -> OffsetAndSlope:
    """Parameters of a method-1046 operation from its WKT2.

    Raises
    ------
    DataError
        If the text is no such operation, or a parameter is missing or in an unknown unit.
    """
    from pyproj.crs import CoordinateOperation  # type: ignore[attr-defined]
    from pyproj.exceptions import CRSError

    try:
        operation = CoordinateOperation.from_string(text)
    except CRSError as error:
        raise DataError("not the WKT of a coordinate operation", value=error) from None
    if operation.method_code != "1046":
        raise DataError(
            "the operation is of another method",
            value=operation.method_name,
            allowed="Vertical Offset and Slope, EPSG 1046",
        )
    in_unit = {"metre": 1.0, "degree": 1.0, "arc-second": 1.0}
    found = {}
    for one in operation.params:
        if one.unit_name not in in_unit:
            raise DataError(
                "a parameter has an unknown unit", value=f"{one.name} in {one.unit_name}"
            )
        found[one.name] = float(one.value)
    missing = [name for name in _PARAMETERS if name not in found]
    if missing:
        raise DataError("parameters are missing in the operation", value=", ".join(missing))
    return OffsetAndSlope(*(found[name] for name in _PARAMETERS))
