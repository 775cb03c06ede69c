"""`clockgeo screen`: which epochs of a record should not count, and why."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from clockgeo.cli.options import Force, Json, PictureFile, Quiet
from clockgeo.cli.recording import RecordReading, with_record_options

if TYPE_CHECKING:
    from collections.abc import Sequence

    from clockgeo.frequency import Finding, Screening

GrossBound = Annotated[
    float | None,
    typer.Option(
        "--gross-bound", min=1e-30, help="Largest credible distance from the median, fractional."
    ),
]
Threshold = Annotated[
    float | None,
    typer.Option(
        "--threshold", min=3.0, help="Outliers, in robust standard deviations; 6 if absent."
    ),
]
Window = Annotated[
    float | None, typer.Option("--window", min=1.0, help="Running median, s; 300 if absent.")
]
Rules = Annotated[
    Path | None, typer.Option("--rules", help="TOML file with screening rules and masks.")
]
Out = Annotated[
    Path | None, typer.Option("--out", help="File for the verdicts: .csv, .json or .nc.")
]
_SHOWN_EPOCHS = 20


@with_record_options
def command(
    reading: RecordReading,
    gross_bound: GrossBound = None,
    threshold: Threshold = None,
    window: Window = None,
    rules: Rules = None,
    out: Out = None,
    picture: PictureFile = None,
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Flag the epochs of records that should not count, with reasons.

    Nothing is deleted: the mean is shown with and without. Cycle slips are named where --carrier
    says whose cycles are counted. Interpolated rows, servo oscillations and steps across gaps are
    pointed out. --picture draws the record with its flags (several records: name-1, name-2 ...).

    Example: clockgeo screen examples/saddle/records/local-1.txt.gz
    """
    from clockgeo.cli.picturing import draw_screenings, numbered_pictures
    from clockgeo.cli.terminal import print_json, progress_shown
    from clockgeo.frequency import ScreeningRules, diagnose, screen
    from clockgeo.frequency.screening_files import (
        read_screening_rules,
        screening_object,
        write_screening,
    )

    pictures = numbered_pictures(picture, len(reading.files), replace=force)
    base = ScreeningRules() if rules is None else read_screening_rules(rules)
    stated = {"gross_bound": gross_bound, "outlier_threshold": threshold, "window": window}
    used = base.model_copy(
        update={key: value for key, value in stated.items() if value is not None}
    )
    carrier = None if reading.carrier is None else float(reading.carrier)
    with progress_shown(quiet=quiet or json):
        screenings = [screen(record, used, carrier_hz=carrier) for record in reading.records()]
        findings = [diagnose(each.record, valid=each.valid) for each in screenings]
    draw_screenings(screenings, pictures, replace=force)
    if out is not None:
        write_screening(out, screenings, findings, replace=force)
    if json:
        print_json({"schema": "clockgeo/screen/1", **screening_object(screenings, findings)})
    elif not quiet:
        for screening, found in zip(screenings, findings, strict=True):
            _show(screening, found)


def _show(screening: Screening, findings: Sequence[Finding]) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.frequency import Reason
    from clockgeo.times import iso_utc

    record = screening.record
    say(
        f"{record.name}: {len(record)} rows, {iso_utc(record.start, digits=0)} to "
        f"{iso_utc(record.stop, digits=0)}, interval {record.interval:g} s, "
        f"uptime {100 * record.uptime:.0f} %"
    )
    show_table("Epochs per reason", ["reason", "epochs"], _lines(screening.counts))
    means = [("with screening", screening.mean_with), ("without", screening.mean_without)]
    means.append(("difference", screening.mean_with - screening.mean_without))
    show_table("Mean", ["", "y"], [(name, f"{value:.6e}") for name, value in means])
    flagged = screening.flagged().tolist()
    if flagged:
        shown = flagged[:_SHOWN_EPOCHS]
        show_table(
            f"Flagged epochs ({len(shown)} of {len(flagged)})",
            ["time", "reason", "y"],
            [
                (
                    iso_utc(int(record.tai_ns[row])),
                    Reason(int(screening.reasons[row])).words,
                    f"{record.y[row]:.4e}",
                )
                for row in shown
            ],
            left=2,
        )
    for note in [*record.notes, *screening.notes]:
        say(f"note: {note}")
    for finding in findings:
        say(f"found: {finding.words}")
    say()


def _lines(counts: dict[str, int]) -> list[tuple[str, str]]:
    return [(reason.replace("_", " "), str(count)) for reason, count in counts.items()]
