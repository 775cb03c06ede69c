"""The command check: everything that is wrong, at once; and the schema for editors."""

from __future__ import annotations

import json
import shutil

import pytest
from typer.testing import CliRunner

from clockgeo.cli import app


def run(*words):
    return CliRunner().invoke(app, ["check", *map(str, words)])


@pytest.fixture
def saddle(project, tmp_path):
    return shutil.copytree(project / "examples" / "saddle", tmp_path / "saddle") / "campaign.toml"


def test_the_shipped_example_is_in_order(project):
    result = run(project / "examples" / "saddle" / "campaign.toml")
    assert result.exit_code == 0
    assert "The document and its records are in order." in result.stdout
    assert result.stdout.count("measured") == 7


def test_every_problem_of_the_records_is_told_at_once(saddle):
    (saddle.parent / "records" / "local-2.txt.gz").unlink()
    (saddle.parent / "records" / "saddle-1.txt.gz").write_bytes(b"")
    text = saddle.read_text(encoding="utf-8").replace("2027-05-11T07", "2027-07-11T07")
    saddle.write_text(text, encoding="utf-8")
    result = run(saddle, "--json")
    told = json.loads(result.stdout)
    assert result.exit_code == 1
    assert told["schema"] == "clockgeo/check/1"
    assert [one["state"] for one in told["sessions"]].count("problem") == 2
    for problem, words in zip(
        told["problems"],
        (
            "'local 2': the record's file does not exist",
            "'saddle 1': the file is empty",
            "'local 4'",
        ),
        strict=True,
    ):
        assert words in problem


def test_every_problem_of_the_document_is_told_at_once(saddle):
    text = saddle.read_text(encoding="utf-8")
    for old, new in (
        ("latitude = 46.85", "latitude = 146.85"),
        ("u = 1.8e-18", "u = -1.8e-18"),
        ("uptime = 0.68", "uptme = 0.68"),
        ('links = ["bench"]', 'links = ["bank"]'),
    ):
        assert old in text
        text = text.replace(old, new, 1)
    saddle.write_text(text, encoding="utf-8")
    problems = json.loads(run(saddle, "--json").stdout)["problems"]
    assert len(problems) == 4
    assert any("did you mean 'uptime'" in problem for problem in problems)
    assert any("no [[link]] is called 'bank'" in problem for problem in problems)


def test_a_planned_session_is_no_problem(saddle):
    text = saddle.read_text(encoding="utf-8")
    record = 'record = { file = "records/local-4.txt.gz", value = "fractional" }'
    assert record in text
    saddle.write_text(text.replace(record, ""), encoding="utf-8")
    result = run(saddle)
    assert result.exit_code == 0
    assert "planned" in result.stdout


def test_a_clock_whose_records_overlap_at_two_sites_is_told(saddle):
    """The document gives no times here, so that only the records tell."""
    text = saddle.read_text(encoding="utf-8")
    text = text.replace("records/saddle-1.txt.gz", "records/local-1.txt.gz", 1).replace(
        'records/local-1.txt.gz", value = "ratio"', 'records/local-1.txt.gz", value = "fractional"'
    )
    text = text.replace("start = 2027-05-06T06:00:00Z\nhours = 12.0\n", "")
    saddle.write_text(text, encoding="utf-8")
    result = run(saddle)
    assert result.exit_code == 1
    assert "clock 'wanderer' is at 'kesselin' while the record of 'local 1'" in result.stdout


def test_network_tables_are_checked_too(project, tmp_path):
    folder = shutil.copytree(project / "examples" / "four-datums", tmp_path / "example")
    result = run(folder / "campaign.toml")
    assert result.exit_code == 0
    assert "height network: 400 points; observations: 595 of lines" in result.stdout
    with (folder / "lines.csv").open("a", encoding="utf-8") as stream:
        stream.write("coast-001,nowhere,1.0,1000\n")
    result = run(folder / "campaign.toml")
    assert result.exit_code == 1
    assert "to is not a point of the net" in result.stdout


def test_the_schema_is_a_json_schema_of_the_document():
    schema = json.loads(run("--schema").stdout)
    assert schema["$schema"].startswith("https://json-schema.org/")
    assert {"campaign", "site", "clock", "link", "session", "geoid"} <= set(schema["properties"])


@pytest.mark.parametrize(
    ("kind", "names"),
    [
        ("level", {"schema", "sessions", "sites", "differences", "covariance", "provenance"}),
        ("adjust", {"schema", "datums", "observations", "global_test", "variance_components"}),
        ("plan", {"schema", "targets", "sessions", "limits", "alternatives"}),
    ],
)
def test_results_have_a_published_schema(kind, names):
    schema = json.loads(run("--result-schema", kind).stdout)
    assert schema["$schema"].startswith("https://json-schema.org/")
    assert names <= set(schema["properties"])


def test_neither_document_nor_schema_is_wrong_usage():
    assert run().exit_code == 2
