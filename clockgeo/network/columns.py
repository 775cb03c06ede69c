"""Tables of many rows as checked columns, from files or from rows in the document.

A file is CSV with a header (lines beginning with # are comments), GeoJSON (a FeatureCollection;
properties are columns, a point's coordinates are longitude and latitude) or netCDF (variables over
one dimension). Every bad row is named, all at once.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel

from clockgeo.errors import DataError
from clockgeo.network.identifiability import listed

if TYPE_CHECKING:
    import polars as pl

__all__ = ["Columns", "from_rows", "read_columns"]

_SHOWN = 5


@dataclass(frozen=True, eq=False)
class Columns:
    """Columns of equal length; numbers that are not given are NaN, texts are empty.

    Attributes
    ----------
    source : str
        Where they come from, for messages.
    texts, numbers : mapping of name to array, shape (N,)
    """

    source: str
    texts: Mapping[str, NDArray[np.object_]]
    numbers: Mapping[str, NDArray[np.float64]]

    def __len__(self) -> int:
        return next(iter(self.texts.values())).size if self.texts else 0

    def filled(self, name: str, otherwise: float | None) -> NDArray[np.float64]:
        """Return a column of numbers with `otherwise` where none is given."""
        column = self.numbers[name]
        if otherwise is None:
            return column
        return np.where(np.isnan(column), otherwise, column)

    def refuse(self, bad: NDArray[np.bool_], what: str, *, key: str, advice: str = "") -> None:
        """Raise DataError naming the rows where `bad` is true, if there are any.

        Parameters
        ----------
        bad : bool array, shape (N,)
        what : str
            What is wrong with them.
        key : str
            Column of texts that names a row.
        advice : str
        """
        rows = np.flatnonzero(bad)
        if rows.size:
            shown = listed([f"row {row + 1} ({self.texts[key][row]})" for row in rows], most=_SHOWN)
            raise DataError(
                f"{rows.size} of {len(self)} rows: {what}",
                value=shown,
                where=self.source,
                advice=advice or None,
            )


def from_rows(
    rows: Sequence[BaseModel], *, source: str, texts: Sequence[str], numbers: Sequence[str]
) -> Columns:
    """Columns of rows that stand in the document."""
    plain = [row.model_dump(by_alias=True) for row in rows]

    def number(value: float | None) -> float:
        return float("nan") if value is None else value

    return Columns(
        source,
        {name: np.array([row[name] or "" for row in plain], dtype=object) for name in texts},
        {name: np.array([number(row[name]) for row in plain], dtype=float) for name in numbers},
    )


def read_columns(
    path: str | Path, *, texts: Sequence[str], numbers: Sequence[str], required: Sequence[str]
) -> Columns:
    """Read a table of many rows.

    Parameters
    ----------
    path : path
        `.csv`, `.txt`, `.geojson`, `.json` or `.nc`.
    texts, numbers : sequence of str
        Columns that may be there; others are refused.
    required : sequence of str
        Columns that must be there and filled in every row.

    Raises
    ------
    DataError
        If the file is missing or no such table, or rows are bad; names the file and the rows.
    """
    path = Path(path)
    if not path.is_file():
        raise DataError("the table is not there", value=path.name, where=str(path.parent))
    reader = _READERS.get(path.suffix.lower())
    if reader is None:
        raise DataError(
            "unknown kind of table", value=path.name, allowed=f"Files {', '.join(_READERS)}"
        )
    frame = reader(path)
    _check_names(frame.columns, (*texts, *numbers), required, path.name)
    if frame.height == 0:
        raise DataError("the table has no rows", where=path.name)
    columns = Columns(
        path.name,
        {name: _texts(frame, name) for name in texts},
        {name: _numbers(frame, name, path.name) for name in numbers},
    )
    key = next((name for name in texts if name in frame.columns), texts[0])
    for name in required:
        empty = (
            columns.texts[name] == "" if name in columns.texts else np.isnan(columns.numbers[name])
        )
        columns.refuse(np.asarray(empty, dtype=bool), f"{name} is missing", key=key)
    return columns


def _check_names(
    found: Sequence[str], allowed: Sequence[str], required: Sequence[str], where: str
) -> None:
    missing = [name for name in required if name not in found]
    unknown = [name for name in found if name not in allowed]
    for what, names in (("missing", missing), ("unknown", unknown)):
        if names:
            raise DataError(
                f"{what} column{'s' if len(names) > 1 else ''}",
                value=", ".join(names),
                where=where,
                allowed=f"Columns {', '.join(required)}; may have "
                + ", ".join(name for name in allowed if name not in required),
            )


def _texts(frame: pl.DataFrame, name: str) -> NDArray[np.object_]:
    import polars as pl

    if name not in frame.columns:
        return np.full(frame.height, "", dtype=object)
    column = frame[name].cast(pl.String).fill_null("").str.strip_chars()
    return np.array(column.to_list(), dtype=object)


def _numbers(frame: pl.DataFrame, name: str, where: str) -> NDArray[np.float64]:
    import polars as pl

    if name not in frame.columns:
        return np.full(frame.height, np.nan)
    column = frame[name]
    given = column.is_not_null()
    if column.dtype == pl.String:
        column = column.str.strip_chars()
        given = column.is_not_null() & (column != "")
    values = column.cast(pl.Float64, strict=False)
    # A NaN of a netCDF table is its sign for "not given"; in text it is a mistake.
    bad = given & ~(values.is_finite().fill_null(False))
    if column.dtype != pl.String:
        bad = bad & ~values.is_nan().fill_null(False)
    rows = np.flatnonzero(bad.to_numpy())
    if rows.size:
        shown = listed([f"row {row + 1} ({frame[name][int(row)]!r})" for row in rows], most=_SHOWN)
        raise DataError(
            f"{rows.size} of {frame.height} rows: {name} is not a finite number",
            value=shown,
            where=where,
        )
    return np.where(given.to_numpy(), values.fill_null(np.nan).to_numpy(), np.nan)


def _csv(path: Path) -> pl.DataFrame:
    import polars as pl

    try:
        frame = pl.read_csv(path, infer_schema=False, comment_prefix="#")
    except pl.exceptions.NoDataError:
        raise DataError("the table is empty", where=path.name) from None
    except (pl.exceptions.PolarsError, UnicodeDecodeError) as error:
        first = str(error).splitlines()[0]
        raise DataError("not a CSV table in UTF-8", value=first, where=path.name) from None
    return frame.rename({name: name.strip() for name in frame.columns})


def _geojson(path: Path) -> pl.DataFrame:
    import polars as pl

    try:
        features = json.loads(path.read_text(encoding="utf-8"))["features"]
        rows = [_feature(one) for one in features]
    except (ValueError, KeyError, TypeError, IndexError) as error:
        raise DataError(
            "not a GeoJSON collection of features",
            value=f"{type(error).__name__}: {error}",
            where=path.name,
        ) from None
    names = dict.fromkeys(name for row in rows for name in row)
    text = {
        name: [None if row.get(name) is None else str(row[name]) for row in rows] for name in names
    }
    return pl.DataFrame(text, schema=dict.fromkeys(names, pl.String))


def _feature(feature: Mapping[str, Any]) -> dict[str, Any]:
    row = dict(feature["properties"])
    geometry = feature.get("geometry")
    if geometry and geometry["type"] == "Point":
        row["longitude"], row["latitude"] = geometry["coordinates"][:2]
    if "id" in feature:
        row.setdefault("id", feature["id"])
    return row


def _netcdf(path: Path) -> pl.DataFrame:
    import polars as pl
    import xarray as xr

    try:
        with xr.open_dataset(path, engine="netcdf4") as dataset:
            table = {str(name): one.values for name, one in dataset.variables.items()}
    except (OSError, ValueError) as error:
        raise DataError("not a netCDF file", value=error, where=path.name) from None
    lengths = {values.shape for values in table.values()}
    if len(lengths) != 1 or len(next(iter(lengths))) != 1:
        raise DataError(
            "a netCDF table has variables over one dimension",
            value=f"shapes {sorted(lengths)}",
            where=path.name,
        )
    return pl.DataFrame({name: list(v) if v.dtype == object else v for name, v in table.items()})


_READERS: dict[str, Callable[[Path], pl.DataFrame]] = {
    ".csv": _csv,
    ".txt": _csv,
    ".geojson": _geojson,
    ".json": _geojson,
    ".nc": _netcdf,
}
