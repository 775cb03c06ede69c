"""A campaign on published records: two pairs of clocks in one building, so no height difference.

Records: four days of optical clock comparisons from a public research data repository (2025); see
the README beside them. On the second day clock one is said to stand at a second site of the same
building: the truth of that difference is zero.
"""

from __future__ import annotations

import json

import pytest
from typer.testing import CliRunner

from clockgeo.cli import app

DOCUMENT = """
[campaign]
name = "Two pairs in one building"
tide_system = "zero_tide"
reference_site = "first"

[[site]]
id = "first"
latitude = 52.0
longitude = 10.0
geopotential_number = 750.0

[[site]]
id = "second"
latitude = 52.0
longitude = 10.0

[[clock]]
id = "one"
nominal_frequency = "642121496772645.12"

[[clock]]
id = "two"
nominal_frequency = "429228004229872.99"

[[clock]]
id = "three"
nominal_frequency = "518295836590863.63"
"""

SESSION = """
[[session]]
id = "{id}"
numerator = {{ clock = "{clock}", site = "{site}" }}
denominator = {{ clock = "two", site = "first" }}
record = {{ file = "{file}" }}
"""

DAYS = {
    "pair1-day1": ("one", "first"),
    "pair1-day2": ("one", "second"),
    "pair1-day3": ("one", "first"),
    "pair2-day3": ("three", "first"),
}


def run(*words):
    return CliRunner().invoke(app, list(map(str, words)))


@pytest.fixture(scope="module")
def document(real_records, tmp_path_factory):
    sessions = [
        SESSION.format(id=day, clock=clock, site=site, file=real_records / f"{day}.txt.gz")
        for day, (clock, site) in DAYS.items()
    ]
    path = tmp_path_factory.mktemp("real") / "campaign.toml"
    path.write_text(DOCUMENT + "".join(sessions), encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def levelled(document):
    result = run("level", document, "--out", document.parent / "out", "--json")
    assert result.exit_code == 0, result.stderr
    return json.loads(result.stdout)


def test_check_finds_the_records_in_order(document):
    result = run("check", document)
    assert result.exit_code == 0
    assert "in order" in result.stdout


def test_the_difference_within_a_building_is_consistent_with_zero(levelled):
    difference = levelled["differences"][0]
    k = difference["coverage_factor_95"]
    assert abs(difference["geopotential_difference"]) < k * difference["u"]
    # Three days of 1e-18 each, with what the days scatter beyond: below 10 cm, above 5 mm.
    assert 0.05 < difference["u"] < 1.0


def test_the_result_says_what_the_data_show(levelled):
    uptimes = [session["uptime"] for session in levelled["sessions"]]
    # README of the records: 66, 43, 74 and 76 % of the rows are valid.
    assert uptimes == pytest.approx([0.66, 0.43, 0.74, 0.76], abs=0.015)
    assert all(session["flagged"]["not_usable"] > 4000 for session in levelled["sessions"])
    assert levelled["scatter"]["upper"] > 0.0
    assert levelled["noise"][0]["white_fm"] > 0.0
