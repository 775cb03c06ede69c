"""The command simulate: equal seeds, equal bytes; and the shipped records are its work."""

from __future__ import annotations

import gzip
import shutil

import numpy as np
import pytest
from typer.testing import CliRunner

from clockgeo.cli import app


def run(*words):
    return CliRunner().invoke(app, ["simulate", *map(str, words)])


@pytest.fixture(scope="module")
def example(project):
    return project / "examples" / "saddle" / "campaign.toml"


def test_the_shipped_records_are_those_of_the_stated_seed(example, tmp_path):
    assert run(example, "--seed", 3, "--out", tmp_path, "--quiet").exit_code == 0
    for shipped in sorted((example.parent / "records").iterdir()):
        drawn = np.loadtxt(tmp_path / "records" / shipped.name)
        kept = np.loadtxt(shipped)
        # Another processor may round the last bit of a draw differently.
        np.testing.assert_allclose(drawn, kept, rtol=1e-12, atol=0.0)


def test_equal_seeds_give_equal_bytes_and_others_do_not(example, tmp_path):
    for name, seed in (("a", 5), ("b", 5), ("c", 6)):
        assert run(example, "--seed", seed, "--out", tmp_path / name).exit_code == 0
    a, b, c = (tmp_path / name / "records" / "local-1.txt.gz" for name in "abc")
    assert a.read_bytes() == b.read_bytes()
    assert gzip.decompress(a.read_bytes()) != gzip.decompress(c.read_bytes())


def test_records_are_not_replaced_unasked(example, tmp_path):
    assert run(example, "--seed", 5, "--out", tmp_path).exit_code == 0
    refused = run(example, "--seed", 6, "--out", tmp_path)
    assert refused.exit_code == 1
    assert "the output exists already" in refused.stderr
    assert run(example, "--seed", 6, "--out", tmp_path, "--force").exit_code == 0


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ("[truth]", "[target.extra]", "unknown key"),
        ("start = 2027-05-03T07:00:00Z\n", "", "cannot be simulated without start and length"),
        ("kesselin = 19132.80", "kesselyn = 19132.80", "no [[site]] is called 'kesselyn'"),
    ],
)
def test_what_cannot_be_drawn_is_refused(example, tmp_path, old, new, told):
    copy = shutil.copy(example, tmp_path / "campaign.toml")
    text = example.read_text(encoding="utf-8")
    assert old in text
    copy.write_text(text.replace(old, new, 1), encoding="utf-8")
    result = run(copy, "--seed", 1)
    assert result.exit_code == 1
    assert told in result.stderr


def test_a_document_without_truth_says_so(example, tmp_path):
    text = example.read_text(encoding="utf-8").partition("[truth]")[0]
    (tmp_path / "campaign.toml").write_text(text, encoding="utf-8")
    result = run(tmp_path / "campaign.toml", "--seed", 1)
    assert result.exit_code == 1
    assert "no [truth] to draw from" in result.stderr
