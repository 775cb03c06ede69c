"""Options that say how records are laid out, shared by every command that reads records.

A command takes one parameter ``reading: RecordReading``; `with_record_options` gives it the files
and all layout options on the command line instead, so that they are worded once.
"""

from __future__ import annotations

import functools
import inspect
from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, TypeVar

import typer

if TYPE_CHECKING:
    from fractions import Fraction

    from clockgeo.frequency import Record, RecordLayout

__all__ = ["RecordReading", "layout_from_options", "with_record_options"]

Result = TypeVar("Result")


class TimeKind(StrEnum):
    """How times are written."""

    mjd = "mjd"
    iso8601 = "iso8601"


class ValueKind(StrEnum):
    """What values are."""

    fractional = "fractional"
    ratio = "ratio"
    offset = "offset"
    time_error = "time_error"


class StampKind(StrEnum):
    """Which instant of the averaging interval is stamped."""

    start = "start"
    middle = "middle"
    end = "end"


class WeightingKind(StrEnum):
    """Weighting of the frequency counter."""

    pi = "pi"
    lambda_ = "lambda"


@dataclass(frozen=True)
class RecordReading:
    """Files and layout as stated on the command line; `records` reads them.

    Attributes
    ----------
    files : tuple of Path
        One record each.
    layout : RecordLayout
        Layout of every file, the file name left open.
    nominal_ratio, carrier : Fraction or None
        What values are referred to, exact.
    skip_bad_rows : bool
        Leave rows out that cannot be used, and say so.
    """

    files: tuple[Path, ...]
    layout: RecordLayout
    nominal_ratio: Fraction | None
    carrier: Fraction | None
    skip_bad_rows: bool

    def records(self) -> list[Record]:
        """Read every file as a record of its own, with progress."""
        from clockgeo.frequency import read_record
        from clockgeo.progress import track

        return [
            read_record(
                self.layout.model_copy(update={"file": file.name}),
                base=file.parent,
                name=file.name,
                nominal_ratio=self.nominal_ratio,
                carrier=self.carrier,
                skip_bad_rows=self.skip_bad_rows,
            )
            for file in track(self.files, "reading")
        ]


def layout_from_options(
    *,
    time: TimeKind = TimeKind.mjd,
    time_column: str | None = None,
    value: ValueKind = ValueKind.fractional,
    value_column: str | None = None,
    flag_column: str | None = None,
    valid_flags: str | None = None,
    u_column: str | None = None,
    interval: float | None = None,
    stamp: StampKind = StampKind.start,
    weighting: WeightingKind | None = None,
) -> RecordLayout:
    """Make a layout of the options; the file name is left open.

    Raises
    ------
    typer.BadParameter
        If the options do not fit together.
    """
    from pydantic import ValidationError

    from clockgeo.frequency import RecordLayout

    columns = {
        "time_column": time_column,
        "value_column": value_column,
        "flag_column": flag_column,
        "u_column": u_column,
    }
    stated: dict[str, Any] = {
        key: int(column) if column.isdecimal() else column
        for key, column in columns.items()
        if column is not None
    }
    if valid_flags is not None:
        stated["valid_flags"] = tuple(flag.strip() for flag in valid_flags.split(","))
    if weighting is not None:
        stated["weighting"] = weighting.value
    try:
        return RecordLayout(
            file="-",
            time=time.value,
            value=value.value,
            interval=interval,
            stamp=stamp.value,
            **stated,
        )
    except ValidationError as error:
        told = "; ".join(
            f"{'.'.join(map(str, problem['loc']))} {_plainly(problem['msg'])}".strip()
            for problem in error.errors()
        )
        raise typer.BadParameter(told) from None


def _plainly(message: str) -> str:
    return message.removeprefix("Value error, ")


def _exact(text: str | None, option: str) -> Fraction | None:
    """A transition's name, a frequency in Hz, or two of these with / between, as a fraction."""
    if text is None:
        return None
    from clockgeo.errors import ClockgeoError
    from clockgeo.frequency import exact_number, find_transition

    def one(part: str) -> Fraction:
        spelled = any(letter.isalpha() for letter in part.replace("e", "").replace("E", ""))
        return find_transition(part).frequency if spelled else exact_number(part)

    parts = text.split("/")
    try:
        whole = [one(part) for part in parts] if len(parts) <= 2 else [exact_number(text)]
    except ClockgeoError as error:
        message = f"{option}: {error}"
        raise typer.BadParameter(message) from None
    if whole[-1] == 0:
        message = f"{option}: must not be zero"
        raise typer.BadParameter(message)
    return whole[0] / whole[1] if len(whole) == 2 else whole[0]


def _option(annotation: Any, default: Any, name: str, text: str) -> tuple[Any, Any]:
    return Annotated[annotation, typer.Option(name, help=text)], default


_OPTIONS: dict[str, tuple[Any, Any]] = {
    "time": _option(TimeKind, TimeKind.mjd, "--time", "MJD (UTC) or ISO 8601."),
    "time_column": _option(
        str | None,
        None,
        "--time-column",
        "Column of the times, by number from 1 or name.  [default: 1]",
    ),
    "value": _option(
        ValueKind,
        ValueKind.fractional,
        "--value",
        "Fractional, full ratio, offset in Hz, or time error in s.",
    ),
    "value_column": _option(
        str | None, None, "--value-column", "Column of the values.  [default: 2]"
    ),
    "flag_column": _option(str | None, None, "--flag-column", "Column of a validity flag."),
    "valid_flags": _option(
        str | None, None, "--valid-flags", "Flags that may be used, separated by commas."
    ),
    "u_column": _option(str | None, None, "--u-column", "Column of the u of each row."),
    "interval": _option(
        float | None, None, "--interval", "Sampling interval in s; estimated if absent."
    ),
    "stamp": _option(
        StampKind, StampKind.start, "--stamp", "Instant of its interval that a row is stamped with."
    ),
    "weighting": _option(WeightingKind | None, None, "--weighting", "Weighting of the counter."),
    "nominal": _option(
        str | None,
        None,
        "--nominal-ratio",
        "Nominal ratio: decimal text, or two transitions such as 171Yb/87Sr.",
    ),
    "carrier": _option(
        str | None,
        None,
        "--carrier",
        "Optical frequency of offsets, and of cycle slips: 87Sr, or in Hz.",
    ),
    "skip_bad_rows": _option(
        bool, False, "--skip-bad-rows", "Leave rows out that cannot be used, and say so."
    ),
}
_FILES = Annotated[list[Path], typer.Argument(help="Record files, one record each.")]


def with_record_options(command: Callable[..., Result]) -> Callable[..., Result]:
    """Give a command the record files and layout options in place of its `reading` parameter.

    Parameters
    ----------
    command : callable
        Its first parameter is ``reading: RecordReading``; the others are typer's as usual.

    Returns
    -------
    callable
        The same command as typer shall see it.
    """

    @functools.wraps(command)
    def shown(**options: Any) -> Result:
        files = tuple(options.pop("records"))
        own = {name: options.pop(name) for name in _OPTIONS}
        nominal, carrier = own.pop("nominal"), own.pop("carrier")
        skip = own.pop("skip_bad_rows")
        reading = RecordReading(
            files=files,
            layout=layout_from_options(**own),
            nominal_ratio=_exact(nominal, "--nominal-ratio"),
            carrier=_exact(carrier, "--carrier"),
            skip_bad_rows=skip,
        )
        return command(reading, **options)

    signature = inspect.signature(command, eval_str=True)
    kind = inspect.Parameter.KEYWORD_ONLY
    parameters = [inspect.Parameter("records", kind, annotation=_FILES)]
    parameters += [
        parameter.replace(kind=kind)
        for name, parameter in signature.parameters.items()
        if name != "reading"
    ]
    parameters += [
        inspect.Parameter(name, kind, annotation=annotation, default=default)
        for name, (annotation, default) in _OPTIONS.items()
    ]
    shown.__signature__ = signature.replace(parameters=parameters)  # type: ignore[attr-defined]
    shown.__annotations__ = {parameter.name: parameter.annotation for parameter in parameters}
    del shown.__wrapped__  # typer shall not look through to `reading`
    return shown
