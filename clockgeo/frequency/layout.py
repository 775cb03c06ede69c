"""What a user states about a record: its files, its columns and what they mean."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from clockgeo.tables import Positive, Table

__all__ = ["Column", "RecordLayout"]

Column = Annotated[int, Field(ge=1)] | Annotated[str, Field(min_length=1)]
"""A column by its number, counted from 1, or by its name in the header."""


class RecordLayout(Table):
    """Where a frequency record is and how it is to be read."""

    file: str | tuple[str, ...]
    """File, or files, relative to the document; shell patterns such as `day*.gz` are allowed."""
    format: Literal["text", "netcdf"] | None = None
    """Kind of file; by its ending (`.nc` is netCDF) where not stated."""
    time: Literal["mjd", "iso8601"] = "mjd"
    """How times are written: Modified Julian Date (UTC) or ISO 8601."""
    time_column: Column = 1
    """Column, or netCDF variable, of the times."""
    value: Literal["fractional", "ratio", "offset", "time_error"] = "fractional"
    """Fractional deviation, full ratio against the nominal one, offset in Hz of a carrier, or time
    error in s at the instant of its stamp."""
    value_column: Column = 2
    """Column, or netCDF variable, of the values."""
    flag_column: Column | None = None
    """Column of a validity flag."""
    valid_flags: tuple[int | str, ...] = ()
    """The flags that mean a row may be used; needed with `flag_column`."""
    u_column: Column | None = None
    """Column of a standard uncertainty of each row, in the unit of the value."""
    interval: Positive | None = None
    """Sampling interval in s; estimated from the stamps where not stated."""
    stamp: Literal["start", "middle", "end"] = "start"
    """Which instant of its averaging interval a row is stamped with."""
    weighting: Literal["pi", "lambda"] | None = None
    """Weighting of the frequency counter."""

    @model_validator(mode="after")
    def _flags_stated(self) -> RecordLayout:
        if (self.flag_column is None) != (not self.valid_flags):
            message = "flag_column and valid_flags belong together: say which flags may be used"
            raise ValueError(message)
        if self.value == "time_error" and (self.u_column is not None or self.stamp != "start"):
            message = "time errors belong to the instant of their stamp: no stamp, no u_column"
            raise ValueError(message)
        if not self.files:
            message = "no file is named"
            raise ValueError(message)
        return self

    @property
    def files(self) -> tuple[str, ...]:
        """The file names or patterns, as stated."""
        return (self.file,) if isinstance(self.file, str) else self.file
