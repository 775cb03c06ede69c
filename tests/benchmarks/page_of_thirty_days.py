"""Thirty days at 1 s: levelling against reading the files, the page against levelling; memory.

Run it with: python tests/benchmarks/page_of_thirty_days.py
"""

from __future__ import annotations

import re
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from clockgeo.campaign import level, read_document
from clockgeo.campaign.measuring import nominal_ratio_of
from clockgeo.cli.simulate import command as simulate
from clockgeo.frequency import read_record
from clockgeo.report import level_page
from clockgeo.report.page import render_page

DAYS = 30
SESSIONS = """
[[session]]
id = "valley"
numerator = { clock = "wanderer", site = "harbel" }
denominator = { clock = "anchor", site = "harbel" }
start = 2027-05-01T00:00:00Z
hours = 360.0
uptime = 0.8
record = { file = "records/valley.txt.gz" }

[[session]]
id = "saddle"
numerator = { clock = "wanderer", site = "kesselin" }
denominator = { clock = "anchor", site = "harbel" }
links = ["valley fibre"]
start = 2027-05-16T00:00:00Z
hours = 360.0
uptime = 0.8
record = { file = "records/saddle.txt.gz" }

[[nominal_ratio]]
numerator = "87Sr"
denominator = "171Yb"
u = 1e-17
"""


def document(folder: Path) -> Path:
    """The shipped example with two long sessions at 1 s instead of its own."""
    shipped = Path(__file__).parents[2] / "examples" / "saddle" / "campaign.toml"
    text = shipped.read_text(encoding="utf-8")
    first, last = text.index("[[session]]"), text.index("[geoid]")
    text = text[:first] + SESSIONS + text[last:]
    text = re.sub(r"(?m)^interval = .*$", "interval = 1.0", text)
    path = folder / "campaign.toml"
    path.write_text(text, encoding="utf-8")
    return path


def read_all(path: Path) -> float:
    """Seconds to read the records of all sessions."""
    campaign = read_document(path).campaign
    begin = time.perf_counter()
    for session in campaign.sessions:
        read_record(
            session.record,
            base=path.parent,
            name=session.id,
            nominal_ratio=nominal_ratio_of(campaign, session),
        )
    return time.perf_counter() - begin


def main() -> None:
    with tempfile.TemporaryDirectory() as name:
        path = document(Path(name))
        simulate(path, seed=1, quiet=True)
        read_all(path)
        reading = read_all(path)
        level(read_document(path))  # once to import what is imported on first use
        begin = time.perf_counter()
        levelled = level(read_document(path))
        levelling = time.perf_counter() - begin
        begin = time.perf_counter()
        page = render_page(level_page(levelled.result, levelled.evidence))
        drawing = time.perf_counter() - begin
        words = [sys.executable, "-m", "clockgeo", "level", str(path), "--out", name, "--quiet"]
        begin = time.perf_counter()
        subprocess.run(words, check=True)
        command = time.perf_counter() - begin
    memory = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    rows = sum(record.y.size for record in levelled.evidence.records)
    print(f"{DAYS} days, {rows} rows")
    print(f"reading {reading:.2f} s, levelling {levelling:.2f} s: {levelling / reading:.2f} times")
    print(f"the whole command {command:.2f} s, at most {memory / 1e6:.2f} GB")
    print(f"levelling {levelling:.2f} s, page {drawing:.2f} s: {drawing / levelling:.2f} times")
    print(f"page {len(page.encode()) / 1e6:.2f} MB")


if __name__ == "__main__":
    main()
