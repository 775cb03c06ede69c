"""The base of everything a user states: frozen, checked when made, strict about names."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Annotated

from pydantic import AfterValidator, BaseModel, ConfigDict, Field

__all__ = [
    "Identifier",
    "Instant",
    "Latitude",
    "Longitude",
    "NonNegative",
    "Positive",
    "Table",
    "Uncertainty",
]


class Table(BaseModel):
    """A table of the campaign document, or a part of one.

    Unknown keys, NaN and infinity are refused; instances are frozen. Each wing defines the tables
    of its own trade (a noise model, a record layout, an effect, a datum), and the campaign
    document is put together from them, so that each idea has one home.
    """

    model_config = ConfigDict(
        extra="forbid",
        frozen=True,
        allow_inf_nan=False,
        use_attribute_docstrings=True,
        serialize_by_alias=True,
    )


Identifier = Annotated[str, Field(pattern=r"^\S(.*\S)?$", max_length=80)]
"""A name that other tables refer to: no blank at either end, at most 80 characters."""


def _in_utc(instant: datetime) -> datetime:
    return instant.replace(tzinfo=UTC) if instant.tzinfo is None else instant.astimezone(UTC)


Instant = Annotated[datetime, AfterValidator(_in_utc)]
"""A date and time of ISO 8601; UTC where no zone is given."""

Latitude = Annotated[float, Field(ge=-90.0, le=90.0)]
"""Geodetic latitude in degrees, north positive."""

Longitude = Annotated[float, Field(ge=-180.0, le=360.0)]
"""Longitude in degrees, east positive; both -180..180 and 0..360 are accepted."""

Uncertainty = Annotated[float, Field(ge=0.0)]
"""Standard uncertainty (k = 1), never negative."""

NonNegative = Annotated[float, Field(ge=0.0)]
Positive = Annotated[float, Field(gt=0.0)]
