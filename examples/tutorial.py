"""The whole job in a script or notebook: one record, one campaign, one net of datums, one plan.

    python examples/tutorial.py [FOLDER]

Prints what it finds and writes pictures, a page and results into FOLDER (`tutorial` if not given).
"""

from __future__ import annotations

import sys
from pathlib import Path

import clockgeo

EXAMPLES = Path(__file__).resolve().parent
SADDLE = EXAMPLES / "saddle"


def main(folder: Path) -> None:
    """Run the whole job and write into `folder`."""
    folder.mkdir(parents=True, exist_ok=True)

    # 1. A record: read it without losing a digit, flag what should not count, look at it.
    layout = clockgeo.RecordLayout(file="records/local-1.txt.gz")
    record = clockgeo.read_record(layout, base=SADDLE, name="local 1")
    screening = clockgeo.screen(record)
    print(f"{record.name}: {len(record)} rows, uptime {100 * record.uptime:.0f} %")
    print(f"flagged: {screening.counts}")

    # 2. Its stability: deviations that respect the gaps, a noise model, the mean and its u.
    stability = clockgeo.assess_stability(record, valid=screening.valid)
    mean = stability.mean
    print(f"mean {mean.y:.4e} +- {mean.u:.1e}, white FM {stability.model.white_fm:.1e} at 1 s")
    figure = clockgeo.stability_picture(stability.curves, model=stability.model)
    clockgeo.save_picture(figure, folder / "stability.png", replace=True)

    # 3. A campaign: all sessions in one solution, held against GNSS heights and a geoid.
    document = clockgeo.read_document(SADDLE / "campaign.toml")
    levelled = clockgeo.level(document)
    difference = levelled.result.differences[0]
    print(f"{difference.from_site} to {difference.to_site}: "
          f"{difference.geopotential_difference:.2f} +- {difference.u:.2f} m2 s-2")  # fmt: skip
    for line in levelled.result.comparison:
        print(f"against {line.source}: {line.normalised_error:+.2f} u")
    clockgeo.write_result(levelled.result, folder, replace=True)
    page = clockgeo.level_page(levelled.result, levelled.evidence)
    clockgeo.write_page(folder / "report.html", page, replace=True)

    # 4. Results as xarray, and back from disk.
    numbers = clockgeo.result_dataset(levelled.result)
    print(numbers["geopotential_number"].to_series().round(2).to_dict())
    assert clockgeo.read_result(folder) == levelled.result

    # 5. Height datums: everything that speaks of the same potential in one adjustment.
    adjusted = clockgeo.adjust(clockgeo.read_document(EXAMPLES / "four-datums" / "campaign.toml"))
    for datum in adjusted.result.datums:
        print(f"{datum.name}: offset {datum.offset:+.3f} +- {datum.u:.3f} m")
    print(f"blunders: {adjusted.result.blunders.text[:60]} ...")

    # 6. A plan: what will a campaign reach before anything is moved?
    planned = clockgeo.plan(clockgeo.read_document(EXAMPLES / "harrow-line" / "campaign.toml"))
    for target in planned.result.targets:
        words = "reached" if target.reached else "not reached"
        print(f"target {target.from_end} to {target.to_end}: {words}")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path("tutorial"))
