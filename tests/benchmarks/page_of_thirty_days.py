"""How long the page of a 30-day campaign takes to draw, against levelling it; and its size.

Run it with: python tests/benchmarks/page_of_thirty_days.py
"""

from __future__ import annotations

import re
import tempfile
import time
from pathlib import Path

from clockgeo.campaign import level, read_document
from clockgeo.cli.simulate import command as simulate
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


def main() -> None:
    with tempfile.TemporaryDirectory() as name:
        path = document(Path(name))
        simulate(path, seed=1, quiet=True)
        begin = time.perf_counter()
        levelled = level(read_document(path))
        levelling = time.perf_counter() - begin
        begin = time.perf_counter()
        page = render_page(level_page(levelled.result, levelled.evidence))
        drawing = time.perf_counter() - begin
    rows = sum(record.y.size for record in levelled.evidence.records)
    print(f"{DAYS} days, {rows} rows")
    print(f"levelling {levelling:.2f} s, page {drawing:.2f} s: {drawing / levelling:.2f} times")
    print(f"page {len(page.encode()) / 1e6:.2f} MB")


if __name__ == "__main__":
    main()
