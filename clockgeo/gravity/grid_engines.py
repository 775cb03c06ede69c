"""Engines that let xarray open GTX, ISG and GGXF grids itself.

They are registered as entry points: `xarray.open_dataset("model.gtx")` finds GTX and ISG by their
endings; GGXF must be named, `engine="ggxf"`, because xarray takes it for plain netCDF. What a file
states stands in the attributes of the main variable; nothing is added.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any, ClassVar

import xarray as xr
from xarray.backends import BackendEntrypoint

from clockgeo.errors import DataError
from clockgeo.gravity.grid_content import GridContent
from clockgeo.gravity.grid_dataset import dataset_of_tile
from clockgeo.gravity.grid_ggxf import read_ggxf
from clockgeo.gravity.grid_gtx import read_gtx
from clockgeo.gravity.grid_isg import read_isg

__all__ = ["GgxfEngine", "GtxEngine", "IsgEngine"]


class _GridEngine(BackendEntrypoint):
    """One grid format for xarray."""

    open_dataset_parameters: ClassVar[tuple[str, ...]] = (
        "filename_or_obj",
        "drop_variables",
        "grid",
    )
    ending: ClassVar[str]
    read: Callable[[Path], GridContent]

    def open_dataset(
        self,
        filename_or_obj: Any,
        *,
        drop_variables: str | Iterable[str] | None = None,
        grid: str | None = None,
    ) -> xr.Dataset:
        """Open one grid of a file; `grid` names it where there are several.

        Raises
        ------
        DataError
            If the file is damaged, or holds several grids and none is named.
        """
        path = Path(filename_or_obj)
        content = self.read(path)
        tiles = [tile for tile in content.tiles if grid in (None, tile.name)]
        if len(tiles) != 1:
            raise DataError(
                "no single grid to open" if grid is None else "no such grid",
                value=grid,
                where=path.name,
                allowed=f"grid = one of {', '.join(tile.name for tile in content.tiles)}",
            )
        stated = dict(content.stated)
        dataset = dataset_of_tile(tiles[0], stated, title=stated.pop("source", ""))
        dropped = [drop_variables] if isinstance(drop_variables, str) else drop_variables or ()
        return dataset.drop_vars(dropped, errors="ignore")

    def guess_can_open(self, filename_or_obj: Any) -> bool:
        """Whether the file's ending is that of the format."""
        return isinstance(filename_or_obj, str | Path) and (
            Path(filename_or_obj).suffix.lower() == self.ending
        )


class GtxEngine(_GridEngine):
    """Geoid grids in GTX."""

    description = "Open geoid grids in GTX (.gtx)"
    ending = ".gtx"
    read = staticmethod(read_gtx)


class IsgEngine(_GridEngine):
    """Geoid grids in ISG 2.0 text."""

    description = "Open geoid grids in ISG 2.0 text (.isg)"
    ending = ".isg"
    read = staticmethod(read_isg)


class GgxfEngine(_GridEngine):
    """Geoid grids in OGC GGXF 1.0."""

    description = "Open geoid grids in OGC GGXF 1.0 (.ggxf)"
    ending = ".ggxf"
    read = staticmethod(read_ggxf)
