"""What a user states of a height network: points, datums, levelled lines, GNSS heights, gauges.

Each table may hold a few rows itself or name a file with many (CSV, GeoJSON or netCDF; the columns
are those of the row tables below, see `reading`). What is stated in the table holds for all rows.
"""

from __future__ import annotations

from typing import Literal

from pydantic import Field, model_validator

from clockgeo.gravity.tide_systems import TideSystem
from clockgeo.network.unknowns import Term
from clockgeo.tables import (
    Identifier,
    Latitude,
    Longitude,
    NonNegative,
    Positive,
    Table,
    Uncertainty,
)

__all__ = [
    "LEVELLING_CLASSES",
    "Datum",
    "DatumHeight",
    "GnssHeight",
    "GnssHeights",
    "LevelledLine",
    "Levelling",
    "NetworkPoint",
    "NetworkSettings",
    "Origin",
    "Prior",
    "TermSettings",
    "TideGauge",
]

LevellingClass = Literal["first_I", "first_II", "second_I", "second_II", "third"]

LEVELLING_CLASSES: dict[str, float] = {
    "first_I": 0.5e-3,
    "first_II": 0.7e-3,
    "second_I": 1.0e-3,
    "second_II": 1.3e-3,
    "third": 2.0e-3,
}
"""Order and class -> standard uncertainty of 1 km in m (FGCC 1984, from memory)."""


class NetworkPoint(Table):
    """A point of the net: a benchmark."""

    id: Identifier
    latitude: Latitude
    """Geodetic latitude in degrees."""
    longitude: Longitude
    """Longitude in degrees."""
    gravity: float | None = Field(default=None, ge=9.5, le=10.0)
    """Measured gravity in m s⁻²; orthometric heights need it."""


class Prior(Table):
    """What is known of a parameter beforehand."""

    value: float = 0.0
    u: Uncertainty = Field(gt=0.0)


class TermSettings(Table):
    """Terms of a datum or of a geoid model: true for unknown, or what is known of them.

    Offsets are in m, tilts, elevation and distance terms in m a metre.
    """

    offset: bool | Prior = True
    """Offset of the zero level."""
    tilt_north: bool | Prior = False
    """Rise of the zero surface towards north."""
    tilt_east: bool | Prior = False
    """Rise of the zero surface towards east."""
    elevation: bool | Prior = False
    """Part in proportion to the height of a point."""
    distance: bool | Prior = False
    """Part in proportion to the distance from the origin."""

    def asked(self) -> dict[Term, Prior | None]:
        """Terms that are asked for, in this order, with their priors."""
        found: dict[Term, Prior | None] = {}
        names: tuple[Term, ...] = ("offset", "tilt_north", "tilt_east", "elevation", "distance")
        for name in names:
            stated = getattr(self, name)
            if stated is not False:
                found[name] = stated if isinstance(stated, Prior) else None
        return found


class Origin(Table):
    """A place that tilts and distances are counted from."""

    latitude: Latitude
    longitude: Longitude


class DatumHeight(Table):
    """The published height or geopotential number of a point in a datum."""

    point: Identifier
    height: float | None = None
    """m, of the datum's kind."""
    geopotential_number: float | None = None
    """m² s⁻²; instead of a height."""
    u: Uncertainty | None = None
    """In the unit of the value; that of the datum if absent."""


class Datum(Table):
    """`[[datum]]`: a vertical datum with the heights that were published in it."""

    id: Identifier
    name: str = ""
    kind: Literal["normal", "orthometric", "dynamic", "geopotential"]
    """Kind of its heights; geopotential for numbers in m² s⁻²."""
    tide_system: TideSystem
    convert_tide_system: bool = False
    """Whether its values may be converted to the campaign's tide system."""
    u: NonNegative | None = None
    """Standard uncertainty of a published value beside its datum's terms, in the value's unit."""
    terms: TermSettings = TermSettings()
    """What is unknown of it; tilts need three points off one line that are known otherwise."""
    origin: Origin | None = None
    """Where tilts and distances start; the mean of its points if absent."""
    file: str | None = None
    """CSV, GeoJSON or netCDF with the columns of the rows."""
    heights: tuple[DatumHeight, ...] = Field(default=(), alias="height")


class LevelledLine(Table):
    """A levelled difference between two points, second minus first."""

    id: Identifier | None = None
    from_point: Identifier = Field(alias="from")
    to_point: Identifier = Field(alias="to")
    height_difference: float | None = None
    """Levelled (not orthometric) difference in m; needs gravity along the line."""
    gravity: float | None = Field(default=None, ge=9.5, le=10.0)
    """Mean gravity along the line in m s⁻²; the mean of the two points' gravity if absent."""
    geopotential_difference: float | None = None
    """m² s⁻²; instead of a height difference."""
    u: Uncertainty | None = None
    """In the unit of the difference; instead of a length."""
    length: Positive | None = None
    """Length of the line in m; gives u with the class of the levelling."""


class Levelling(Table):
    """`[[levelling]]`: lines of one levelling of uniform quality."""

    id: Identifier
    name: str = ""
    tide_system: TideSystem
    """That the differences were reduced to."""
    convert_tide_system: bool = False
    """Whether its differences may be converted to the campaign's tide system."""
    levelling_class: LevellingClass | None = Field(default=None, alias="class")
    """Order and class, instead of u_per_root_km."""
    u_per_root_km: NonNegative | None = None
    """Random part in m for 1 km; grows with the root of the length."""
    u_per_km: NonNegative = 0.0
    """Systematic part of each line in m a km; grows with the length."""
    u_scale: NonNegative = 0.0
    """Common scale error of the rods, m a metre of height difference."""
    file: str | None = None
    lines: tuple[LevelledLine, ...] = Field(default=(), alias="line")

    @property
    def root_km(self) -> float | None:
        """Random part in m for 1 km."""
        if self.levelling_class is not None:
            return LEVELLING_CLASSES[self.levelling_class]
        return self.u_per_root_km

    @model_validator(mode="after")
    def _one_quality(self) -> Levelling:
        if self.levelling_class is not None and self.u_per_root_km is not None:
            message = "give either class or u_per_root_km, not both"
            raise ValueError(message)
        return self


class GnssHeight(Table):
    """The ellipsoidal height of a point, with or without the geoid there."""

    point: Identifier
    ellipsoidal_height: float = Field(ge=-12_000.0, le=9_000.0)
    """m"""
    u: Uncertainty | None = None
    """Standard uncertainty in m; that of the table if absent."""
    separation: float | None = Field(default=None, ge=-120.0, le=120.0)
    """Geoid height or height anomaly in m; sampled from the grid of [geoid] if absent."""


class GnssHeights(Table):
    """`[[gnss]]`: ellipsoidal heights that a geoid model turns into geopotential numbers."""

    id: Identifier
    name: str = ""
    tide_system: TideSystem
    """Of the ellipsoidal heights; they are converted on use."""
    u: NonNegative | None = None
    """Standard uncertainty of an ellipsoidal height in m."""
    file: str | None = None
    heights: tuple[GnssHeight, ...] = Field(default=(), alias="height")


class TideGauge(Table):
    """`[[tide_gauge]]`: a benchmark above mean sea level, and mean sea level above W0."""

    point: Identifier
    height_above_mean_sea: float
    """Height of the benchmark above mean sea level in m, levelled at the gauge."""
    u_height_above_mean_sea: Uncertainty
    """Standard uncertainty in m, length of the sea-level record included."""
    dynamic_topography: float
    """Mean sea level above the campaign's zero level in m, from an ocean model."""
    u_dynamic_topography: Uncertainty
    """Standard uncertainty in m."""


class NetworkSettings(Table):
    """`[network]`: the points, and how the net is adjusted."""

    points: str | None = None
    """CSV, GeoJSON or netCDF with the columns id, latitude, longitude and perhaps gravity."""
    zero: Literal["known", "free"] | tuple[Identifier, ...] = "known"
    """Known numbers, inner constraints over all points, or sites whose mean number is held."""
    zero_mean: float = 0.0
    """Value of that mean in m² s⁻²."""
    pairs: tuple[tuple[Identifier, Identifier], ...] = ()
    """Pairs of points whose difference and its u are wanted, beside those of all sites."""
    shared_points: tuple[Identifier, ...] = ()
    """Marks whose heights are published in more than one datum on purpose."""
    geoid_terms: TermSettings = TermSettings(offset=False)
    """Bias and tilts of the geoid model."""
    alpha: float = Field(default=0.001, gt=0.0, lt=0.5)
    """Size of the test of one observation."""
    power: float = Field(default=0.80, gt=0.5, lt=1.0)
    """Power that minimal detectable biases refer to."""
    robust: Literal["none", "huber", "igg3"] = "none"
    """Whether a robust adjustment is shown beside the plain one."""
    without: tuple[str, ...] = ()
    """Observations left out, by their ids; stated in the result."""
