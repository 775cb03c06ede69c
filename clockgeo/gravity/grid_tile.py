"""One regular lattice of a gridded model: where its nodes are, and what lies between them."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from clockgeo.errors import DataError
from clockgeo.gravity.interpolation import HALO, Interpolation, interpolate

__all__ = ["GridTile"]

_ROUNDING = 1e-7  # of a cell: a point this little outside is on the edge
_ALIKE = 1e-3  # of a cell: how well a lattice must meet a pole or close around the Earth


@dataclass(frozen=True, eq=False)
class GridTile:
    """Values at the nodes of a regular lattice in latitude and longitude.

    Attributes
    ----------
    south, west : float
        Latitude and longitude of the first node in degrees.
    latitude_step, longitude_step : float
        Distances of the nodes in degrees, > 0.
    values : float array, shape (rows, columns)
        m, from south to north and west to east; NaN for no data.
    u : float array of the same shape, or None
        Standard uncertainty of each node in m.
    rate : float array of the same shape, or None
        Change of each value in m a year.
    name : str
        Of the grid within its file.
    depth, priority : int
        Place in a nest of grids: the deepest, then the highest priority, then the finest wins.

    Raises
    ------
    DataError
        If a shape or a step cannot be that of a lattice.

    Notes
    -----
    Around a lattice lies a halo of nodes. That of a lattice that closes around the Earth continues
    along the parallels and over the poles to the opposite meridians; that of any other edge is the
    parabola through the three nodes next to it, the boundary condition of Keys (1981).
    """

    south: float
    west: float
    latitude_step: float
    longitude_step: float
    values: NDArray[np.floating] = field(repr=False)
    u: NDArray[np.floating] | None = field(default=None, repr=False)
    rate: NDArray[np.floating] | None = field(default=None, repr=False)
    name: str = ""
    depth: int = 0
    priority: int = 0

    def __post_init__(self) -> None:
        shape = self.values.shape
        fits = all(other is None or other.shape == shape for other in (self.u, self.rate))
        if len(shape) != 2 or min(shape) < 2 or not fits:
            raise DataError(
                "not the shape of a lattice",
                value=shape,
                where=self.name or None,
                allowed="At least 2 rows and 2 columns; u and rate of the same shape",
            )
        if not (self.latitude_step > 0.0 and self.longitude_step > 0.0):
            raise DataError(
                "the steps of a lattice must be positive",
                value=f"{self.latitude_step}, {self.longitude_step}",
                where=self.name or None,
            )

    @property
    def north(self) -> float:
        """Latitude of the last row in degrees."""
        return float(self.south + (self.values.shape[0] - 1) * self.latitude_step)

    @property
    def width(self) -> float:
        """Longitude of the last column minus that of the first, degrees."""
        return float((self.values.shape[1] - 1) * self.longitude_step)

    @property
    def latitudes(self) -> NDArray[np.float64]:
        """Latitudes of the rows in degrees, ascending."""
        return np.asarray(self.south + self.latitude_step * np.arange(self.values.shape[0]))

    @property
    def longitudes(self) -> NDArray[np.float64]:
        """Longitudes of the columns in degrees, ascending; may run past 180."""
        return np.asarray(self.west + self.longitude_step * np.arange(self.values.shape[1]))

    @property
    def closes(self) -> bool:
        """Whether the columns go round the Earth."""
        turn = 360.0 / self.longitude_step
        return bool(abs(self.values.shape[1] - turn) < _ALIKE)

    @property
    def precedence(self) -> tuple[int, int, float]:
        """Sorts tiles so that the one that wins where several hold a point comes first."""
        return -self.depth, -self.priority, self.latitude_step * self.longitude_step

    def sample(
        self,
        which: str,
        latitude: NDArray[np.float64],
        longitude: NDArray[np.float64],
        method: Interpolation,
    ) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
        """Interpolate a field of the tile at points.

        Parameters
        ----------
        which : {"values", "u", "rate"}
        latitude, longitude : float array, shape (N,)
            Degrees, checked.
        method : Interpolation

        Returns
        -------
        tuple of arrays, shape (N,)
            Values, NaN outside and beside nodes without data; and which points lie inside.
        """
        padded = self._padded[which]
        columns = self.values.shape[1]
        row_place = (latitude - self.south) / self.latitude_step
        column_place = (longitude - self.west) / self.longitude_step
        turn = 360.0 / self.longitude_step
        column_place -= turn * np.floor((column_place + _ROUNDING) / turn)
        low, high = self._rows_reached
        inside = (row_place >= low - _ROUNDING) & (row_place <= high + _ROUNDING)
        if not self.closes:
            inside &= column_place <= columns - 1 + _ROUNDING
        every_point = bool(inside.all())
        if not every_point:
            row_place = np.where(inside, row_place, 0.0)
            column_place = np.where(inside, column_place, 0.0)
        row = _lower_node(row_place, int(np.floor(low)), int(np.ceil(high)) - 1)
        column = _lower_node(column_place, 0, columns - (1 if self.closes else 2))
        values = interpolate(
            padded, row, column, row_place - row, column_place - column, method=method
        )
        if not every_point:
            values[~inside] = np.nan
        return values, inside

    @cached_property
    def _padded(self) -> dict[str, NDArray[np.floating]]:
        """Each field with its halo."""
        fields = {"values": self.values, "u": self.u, "rate": self.rate}
        return {name: self._with_halo(f) for name, f in fields.items() if f is not None}

    @cached_property
    def _rows_reached(self) -> tuple[float, float]:
        """First and last row number with values; half a row more where the halo spans a pole."""
        rows = self.values.shape[0]
        spans = [
            self.closes and self.values.shape[1] % 2 == 0 and abs(gap - 0.5) < _ALIKE
            for gap in self._gaps_to_poles
        ]
        return (-0.5 if spans[0] else 0.0), rows - (0.5 if spans[1] else 1.0)

    @property
    def _gaps_to_poles(self) -> tuple[float, float]:
        """Distance from the first and the last row to their poles, in rows."""
        return (self.south + 90.0) / self.latitude_step, (90.0 - self.north) / self.latitude_step

    def _with_halo(self, values: NDArray[np.floating]) -> NDArray[np.floating]:
        rows, columns = values.shape
        kind = np.float32 if values.dtype == np.float32 else np.float64
        padded = np.full((rows + 2 * HALO, columns + 2 * HALO), np.nan, dtype=kind)
        middle = padded[HALO:-HALO]
        middle[:, HALO:-HALO] = values
        if self.closes:
            middle[:, :HALO] = middle[:, columns : columns + HALO]
            middle[:, -HALO:] = middle[:, HALO : 2 * HALO]
        else:
            _continue_edges(middle.T)
        _continue_edges(padded)
        if self.closes and columns % 2 == 0:
            for gap, lines in zip(self._gaps_to_poles, (padded, padded[::-1]), strict=True):
                _over_pole(lines, gap, columns)
        return padded


def _lower_node(place: NDArray[np.float64], lowest: int, highest: int) -> NDArray[np.intp]:
    """Lower node of each point's cell; the last node belongs to the last cell."""
    node = np.floor(place).astype(np.intp)
    np.clip(node, lowest, highest, out=node)
    return node


def _continue_edges(lines: NDArray[np.floating]) -> None:
    """Fill the line beyond the first and the last one by the parabola of the three next to it."""
    if lines.shape[0] < 3 + 2 * HALO:
        return
    for direction in (lines, lines[::-1]):
        first, second, third = (direction[HALO + i].astype(np.float64) for i in range(3))
        direction[HALO - 1] = 3.0 * (first - second) + third


def _over_pole(lines: NDArray[np.floating], gap: float, columns: int) -> None:
    """Fill the halo lines beyond a pole with the lines of the opposite meridians."""
    if abs(gap) < _ALIKE:
        mirrored = {HALO - 1: HALO + 1, HALO - 2: HALO + 2}
    elif abs(gap - 0.5) < _ALIKE:
        mirrored = {HALO - 1: HALO, HALO - 2: HALO + 1}
    else:
        return
    for halo, source in mirrored.items():
        turned = np.roll(lines[source, HALO:-HALO], columns // 2)
        lines[halo] = np.concatenate([turned[-HALO:], turned, turned[:HALO]])
