"""A campaign whose ratios come along chains of comparators, from the shipped example."""

from __future__ import annotations

import json
import shutil
from dataclasses import replace

import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.campaign import Campaign, level_measured, measure_record, read_document
from clockgeo.cli import app
from clockgeo.frequency.chain import find_chains
from clockgeo.frequency.combination import combine
from clockgeo.frequency.exchange import read_exchange, read_outputs
from clockgeo.frequency.exchange_writing import output_text
from clockgeo.planning import simulate_sessions

TRUTH = {"westrun": 712.40, "middle": 3498.65, "eastrun": 410.77}


def run(*words):
    return CliRunner().invoke(app, list(map(str, words)))


@pytest.fixture(scope="module")
def example(project):
    return project / "examples" / "three-laboratories" / "campaign.toml"


@pytest.fixture(scope="module")
def told(example, tmp_path_factory):
    result = run("level", example, "--out", tmp_path_factory.mktemp("out"), "--json")
    assert result.exit_code == 0, result.stderr
    return json.loads(result.stdout)


def test_differences_hold_the_truth(told):
    for one in told["differences"]:
        true = TRUTH[one["to"]] - TRUTH[one["from"]]
        assert abs(one["geopotential_difference"] - true) < 2.6 * one["u"]


def test_the_ledger_says_what_was_not_applied(told):
    notes = [note for session in told["sessions"] for note in session["notes"]]
    assert any("grsA -6.1e-15 not applied" in note for note in notes)
    assert any("uA_sys 2e-18 not used" in note for note in notes)
    assert any("WESTRUN_SR - WESTRUN_LASER - MIDDLE_LASER - EASTRUN_SR" in note for note in notes)


def test_headers_and_data_are_among_the_inputs(told):
    paths = {one["path"] for one in told["provenance"]["inputs"]}
    assert {"network/east.yml", "network/west.yml"} <= paths
    assert sum(path.endswith(".dat") for path in paths) == 8


def test_the_loop_of_three_clocks_closes(told):
    (closure,) = told["closures"]
    assert closure["verdict"] == "closes"
    assert len(closure["sessions"]) == 3
    assert abs(closure["misclosure"]) < 3 * closure["u"]


def test_a_loop_that_does_not_close_is_told(example, tmp_path):
    """Excess scatter grows with a misclosure; the verdict must not follow it."""
    folder = shutil.copytree(example.parent, tmp_path / "copy")
    path = folder / "campaign.toml"
    text = path.read_text(encoding="utf-8")
    old = 'links = ["west fibre", "east fibre"]\n'
    assert old in text
    wrong = 'links = ["west fibre", "east fibre", "slip"]\n'
    slip = '[[link]]\nid = "slip"\neffect = [{ name = "slip", correction = 3e-17, u = 1e-19 }]\n\n'
    text = text.replace(old, wrong, 1).replace("[[session]]", slip + "[[session]]", 1)
    path.write_text(text, encoding="utf-8")
    result = run("level", path, "--out", tmp_path / "out", "--json")
    assert result.exit_code == 0, result.stderr
    told = json.loads(result.stdout)
    assert told["scatter"]["applied"]
    (closure,) = told["closures"]
    assert closure["verdict"] == "does not close"
    assert abs(closure["misclosure"]) == pytest.approx(3e-17 * 299_792_458.0**2, abs=2.0)


def test_correlations_name_their_causes(told):
    pairs = {(one["first"], one["second"]): one for one in told["correlations"]}
    pair = pairs["east and west", "middle and west"]
    assert pair["coefficient"] == pytest.approx(sum(pair["parts"].values()), abs=1e-12)
    assert pair["parts"]["west sr · black-body radiation, temperature"] > 0.0
    opposite = pairs["middle and west", "east and middle"]
    assert opposite["parts"]["middle yb · black-body radiation"] < 0.0


def test_the_example_comes_from_its_seed(example, tmp_path):
    assert run("simulate", example, "--seed", 2, "--out", tmp_path, "--quiet").exit_code == 0
    for shipped in sorted((example.parent / "network").rglob("*.dat")):
        drawn = np.loadtxt(tmp_path / shipped.relative_to(example.parent))
        np.testing.assert_allclose(drawn, np.loadtxt(shipped), rtol=1e-9)


DIRECT = """- name: EASTRUN_SR-WESTRUN_SR
  numrhoBA: '1'
  denrhoBA: '1'
  sB: '429228004229872.99'
  nu0A: '429228004229872.99'
  nu0B: '429228004229872.99'
  interval: '60'
  lag: 1
"""


@pytest.fixture
def with_a_second_path(example, tmp_path):
    """The example with a direct comparator of the outer clocks, off by a stated amount."""

    def made(offset):
        folder = shutil.copytree(example.parent, tmp_path / f"off by {offset}")
        network = read_exchange(folder / "network")
        chain = find_chains(network.comparators, denominator="WESTRUN_SR", numerator="EASTRUN_SR")[
            0
        ]
        names = [link.comparator.name for link in chain.links]
        record = combine([chain], read_outputs(network, names), name="direct").record
        # The first session's day only; a third of it missing.
        day = (record.tick - record.tick[0]) * 60 < 86_400
        usable = record.usable & day & (np.arange(len(record)) % 3 > 0)
        direct = replace(record, y=record.y + offset, usable=usable)
        (folder / "network" / "direct.yml").write_text(DIRECT, encoding="utf-8")
        one = read_exchange(folder / "network").comparators["EASTRUN_SR-WESTRUN_SR"]
        (folder / "network" / one.name).mkdir()
        path = folder / "network" / one.name / "day.dat"
        path.write_text(output_text(one, direct), encoding="utf-8")
        return folder / "campaign.toml"

    return made


def test_paths_that_agree_are_combined_and_counted_within_their_session(
    with_a_second_path, tmp_path
):
    document = with_a_second_path(0.0)
    result = run("level", document, "--out", tmp_path / "out", "--json")
    assert result.exit_code == 0, result.stderr
    told = json.loads(result.stdout)
    notes = {session["id"]: " ".join(session["notes"]) for session in told["sessions"]}
    assert "epochs have several paths" in notes["east and west"]
    assert "closes" in notes["east and west"]
    for other in ("middle and west", "east and middle"):
        assert "several paths" not in notes[other]
        assert "loop" not in notes[other]
    assert told["notes"] == []


def test_paths_that_contradict_each_other_are_a_doubt(with_a_second_path, tmp_path):
    document = with_a_second_path(1e-16)
    result = run("level", document, "--out", tmp_path / "out")
    assert result.exit_code == 0, result.stderr
    told = result.stdout.replace("\n", " ")
    assert "session east and west: paths of comparators contradict each other" in told
    assert "does not close" in told
    checked = run("check", document)
    assert checked.exit_code == 0
    assert "in order, but look at the doubts above first" in checked.stdout.replace("\n", " ")


def test_headers_that_are_missing_are_written_too(example, tmp_path):
    """The document alone: simulate makes the exchange folder, and level reads it back."""
    document = tmp_path / "campaign.toml"
    document.write_text(example.read_text(encoding="utf-8"), encoding="utf-8")
    assert run("simulate", document, "--seed", 5, "--quiet").exit_code == 0
    folder = tmp_path / "network"
    assert "518295836590863.63" in (folder / "comparators.yml").read_text(encoding="utf-8")
    result = run("level", document, "--out", tmp_path / "out", "--json")
    assert result.exit_code == 0, result.stderr
    for one in json.loads(result.stdout)["differences"]:
        true = TRUTH[one["to"]] - TRUTH[one["from"]]
        assert abs(one["geopotential_difference"] - true) < 3.5 * one["u"]
    refused = run("simulate", document, "--seed", 5, "--quiet")
    assert refused.exit_code == 1
    assert "exists already" in refused.stderr


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'folder = "network"',
            'folder = "nowhere"',
            "the folder of the exchange format does not exist",
        ),
        ('numerator = "EASTRUN_SR"', 'numerator = "EASTRUN_CA"', "no comparator has such an"),
        ("2027-09-06T00", "2027-08-06T00", "no valid epoch within the session's times"),
    ],
)
def test_bad_chains_are_refused(example, tmp_path, old, new, message):
    folder = shutil.copytree(example.parent, tmp_path / "copy")
    text = (folder / "campaign.toml").read_text(encoding="utf-8")
    assert old in text
    (folder / "campaign.toml").write_text(text.replace(old, new, 1), encoding="utf-8")
    result = run("level", folder / "campaign.toml", "--out", tmp_path / "out")
    assert result.exit_code == 1
    assert message in result.stderr


def test_other_frequencies_in_a_header_are_refused(example, tmp_path):
    folder = shutil.copytree(example.parent, tmp_path / "copy")
    path = folder / "network" / "east.yml"
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace("nu0A: 194400121000000.0", "nu0A: 194400121000001.0"))
    result = run("check", folder / "campaign.toml")
    assert result.exit_code == 1
    assert "two nominal frequencies of oscillator MIDDLE_LASER" in result.stdout


def test_heights_and_their_correlation_cover_the_truth(example):
    """Drawn campaigns: chi-squared of both heights together, with their covariance."""
    document = read_document(example)
    campaign: Campaign = document.campaign.model_copy(
        update={"head": document.campaign.head.model_copy(update={"tide": "none"})}
    )
    squares, inside, runs = [], 0, 24
    for seed in range(runs):
        drawn = simulate_sessions(campaign, np.random.default_rng(seed), tables=document.folder)
        measured = [
            measure_record(campaign, one.session, one.record(), folder=document.folder)
            for one in drawn
        ]
        result = level_measured(campaign, measured, folder=document.folder).result
        matrix = np.array(result.covariance.matrix)
        numbers = np.array([site.geopotential_number for site in result.sites])
        # The reference's own uncertainty moves all numbers alike and is not drawn.
        step = np.array([[-1.0, 1.0, 0.0], [-1.0, 0.0, 1.0]])
        error = step @ (numbers - np.array([TRUTH[site.id] for site in result.sites]))
        squares.append(float(error @ np.linalg.solve(step @ matrix @ step.T, error)))
        inside += squares[-1] < 5.991  # 95 % point of chi-squared with two degrees of freedom
    assert inside >= runs * 0.95 - 3 * np.sqrt(runs * 0.95 * 0.05)
    assert np.mean(squares) == pytest.approx(2.0, abs=4 * np.sqrt(4.0 / runs))
