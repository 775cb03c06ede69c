"""`clockgeo stability`: deviations, noise model and uncertainty of the mean of records."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from clockgeo.cli.options import Force, Json, PictureFile, Quiet
from clockgeo.cli.recording import RecordReading, with_record_options

if TYPE_CHECKING:
    from collections.abc import Sequence

    from clockgeo.frequency import Record, RecordStability
    from clockgeo.frequency.noise import NoiseModel

Statistics = Annotated[
    str,
    typer.Option("--statistic", help="Names, separated by commas; a wrong one lists them all."),
]
Tau = Annotated[
    str, typer.Option("--tau", help="octave, decade, all, or averaging times in s, with commas.")
]
Level = Annotated[
    float, typer.Option("--confidence", help="Confidence level of the intervals, 0 to 1.")
]
Screened = Annotated[
    bool, typer.Option("--screened", help="Leave out what `clockgeo screen` flags.")
]
Flywheel = Annotated[
    str | None,
    typer.Option(
        "--flywheel",
        help="Noise of what carries on over gaps, such as white_fm=1e-13,flicker_fm=3e-16.",
    ),
]
Out = Annotated[Path | None, typer.Option("--out", help="File for the curves: .csv, .json or .nc.")]

_MOST_WINDOWS = 2_000
"""Stretches of uptime that are told apart; their number squared is worked on."""


@with_record_options
def command(
    reading: RecordReading,
    statistic: Statistics = "overlapping-allan",
    tau: Tau = "octave",
    confidence: Level = 0.683,
    screened: Screened = False,
    flywheel: Flywheel = None,
    out: Out = None,
    picture: PictureFile = None,
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Compute deviations, noise model and uncertainty of the mean of records.

    Gaps are never closed up; where complete windows are few, partly filled ones count with what
    the noise makes of them. --flywheel adds the u of carrying a frequency over the gaps. --picture
    draws curves, intervals and the model (several records: name-1, name-2 ...).

    Example: clockgeo stability examples/saddle/records/local-1.txt.gz --statistic
    overlapping-allan,modified-allan
    """
    from clockgeo.cli.picturing import draw_stability, numbered_pictures
    from clockgeo.cli.terminal import print_json, progress_shown
    from clockgeo.frequency import assess_stability
    from clockgeo.frequency.stability_files import (
        SCHEMA,
        checked_stability_file,
        stability_object,
        write_stability,
    )
    from clockgeo.frequency.stability_statistics import find_statistic

    names = [find_statistic(name.strip()).name for name in statistic.split(",")]
    times = _averaging_times(tau)
    model = None if flywheel is None else _noise_of(flywheel)
    if not 0.0 < confidence < 1.0:
        message = f"--confidence: {confidence:g} is not between 0 and 1"
        raise typer.BadParameter(message)
    if picture is not None and len({find_statistic(name).in_time for name in names}) > 1:
        message = "--picture: deviations and time deviations (in s) do not share an axis"
        raise typer.BadParameter(message)
    pictures = numbered_pictures(picture, len(reading.files), replace=force)
    if out is not None:
        checked_stability_file(out, records=len(reading.files), replace=force)
    with progress_shown(quiet=quiet or json):
        results = [
            assess_stability(
                record, names, tau=times, level=confidence, valid=_counting(record, screened)
            )
            for record in reading.records()
        ]
    dead_times = None if model is None else [_dead_time(model, one) for one in results]
    draw_stability(results, pictures, replace=force)
    if out is not None:
        write_stability(out, results, dead_times=dead_times, replace=force)
    if json:
        print_json({"schema": SCHEMA, **stability_object(results, dead_times)})
    elif not quiet:
        for place, result in enumerate(results):
            _show(result, None if dead_times is None else dead_times[place])


def _averaging_times(text: str) -> str | list[float]:
    if text in ("octave", "decade", "all"):
        return text
    try:
        return [float(part) for part in text.split(",")]
    except ValueError:
        message = f"--tau: {text!r} is neither octave, decade, all nor a list of times in s"
        raise typer.BadParameter(message) from None


def _noise_of(text: str) -> NoiseModel:
    """Noise model of law=level pairs."""
    from pydantic import ValidationError

    from clockgeo.frequency.noise import NoiseModel

    pairs = [part.partition("=") for part in text.split(",")]
    try:
        levels = {law.strip(): float(level) for law, _, level in pairs}
        return NoiseModel(**levels)
    except (ValidationError, ValueError):
        laws = ", ".join(NoiseModel.model_fields)
        message = f"--flywheel: {text!r} is no list of law=level with the laws {laws}"
        raise typer.BadParameter(message) from None


def _counting(record: Record, screened: bool) -> Any:
    """Rows that count: all usable ones, or those that screening leaves."""
    if not screened:
        return None
    from clockgeo.frequency import screen

    return screen(record).valid


def _dead_time(model: NoiseModel, result: RecordStability) -> dict[str, Any]:
    """What a flywheel adds when the mean stands for the whole span of the record."""
    from clockgeo.frequency import dead_time_variance, uptime_windows

    interval, bridge = result.record.interval, 1
    windows = uptime_windows(result.tick, interval)
    while len(windows) > _MOST_WINDOWS:  # short gaps beside many others are of no account
        bridge *= 2
        windows = uptime_windows(result.tick, interval, bridge=bridge)
    before = float(result.tick[0] - result.record.tick[0]) * interval
    shifted = [(start + before, stop + before) for start, stop in windows]
    variance = dead_time_variance(model, shifted, result.mean.span_seconds)
    return {
        "u": variance**0.5,
        "span_seconds": result.mean.span_seconds,
        "windows": len(windows),
        "bridged_seconds": (bridge - 1) * interval,
        "flywheel": model,
    }


def _show(result: RecordStability, dead_time: dict[str, Any] | None) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.times import iso_utc

    record, mean = result.record, result.mean
    say(
        f"{record.name}: {len(record)} rows, {iso_utc(record.start, digits=0)} to "
        f"{iso_utc(record.stop, digits=0)}, interval {record.interval:g} s, "
        f"uptime {100 * mean.uptime:.0f} %"
    )
    for curve in result.curves:
        points = zip(
            curve.tau,
            curve.deviation,
            curve.lower,
            curve.upper,
            curve.edf,
            curve.noise,
            curve.partial,
            strict=True,
        )
        show_table(
            f"{curve.statistic}, intervals at {100 * curve.level:g} %",
            ["τ / s", "deviation", "from", "to", "edf", "noise", "windows"],
            [
                (
                    f"{tau:g}",
                    f"{value:.4e}",
                    f"{low:.3e}",
                    f"{high:.3e}",
                    f"{edf:.1f}",
                    noise.replace("_", " "),
                    "partly filled" if partial else "complete",
                )
                for tau, value, low, high, edf, noise, partial in points
            ],
            left=0,
        )
    heads = ["law", "level", "u"]
    show_table("Noise model (deviation at 1 s, or floor)", heads, _levels(result))
    lines = [
        ("mean y", f"{mean.y:.6e}"),
        ("u of the mean", f"{mean.u:.2e}"),
        ("valid", f"{mean.valid_seconds:.0f} s of {mean.span_seconds:.0f} s"),
    ]
    if dead_time is not None:
        lines.append(("u of carrying it over the gaps", f"{dead_time['u']:.2e}"))
    show_table("Mean", ["", ""], lines)
    _say_the_rest(result)


def _levels(result: RecordStability) -> Sequence[tuple[str, str, str]]:
    if result.model is None or result.laws is None or result.fit is None:
        return [("none fitted", "", "")]
    rows = []
    for law, level in result.model.model_dump().items():
        if level:
            u = result.fit.u_drift if law == "drift" else result.laws.u[law]
            unit = " 1/s" if law == "drift" else ""
            rows.append((law.replace("_", " "), f"{level:.3e}{unit}", f"{u:.1e}"))
    return rows


def _say_the_rest(result: RecordStability) -> None:
    from clockgeo.cli.terminal import say

    if result.fit is not None:
        say(f"the flicker floor is below {result.fit.flicker_limit:.2e} (one-sided 95 %)")
    for note in result.notes:
        say(f"note: {note}")
    for finding in result.findings:
        say(f"found: {finding.words}")
    say()
