"""Files appear whole or not at all."""

from __future__ import annotations

import errno
import hashlib
import json
import os
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest

from clockgeo.errors import OutputError
from clockgeo.files import json_text, sha256_of, shipped_grid, whole_file, write_text


def test_text_is_written_whole(tmp_path):
    write_text(tmp_path / "a.txt", "one\ntwo\n")
    assert (tmp_path / "a.txt").read_bytes() == b"one\ntwo\n"
    assert [path.name for path in tmp_path.iterdir()] == ["a.txt"]


def test_what_exists_is_kept_unless_replacing_is_allowed(tmp_path):
    write_text(tmp_path / "a.txt", "old")
    with pytest.raises(OutputError, match=r"exists already: .*a\.txt.*--force"):
        write_text(tmp_path / "a.txt", "new")
    assert (tmp_path / "a.txt").read_text() == "old"
    write_text(tmp_path / "a.txt", "new", replace=True)
    assert (tmp_path / "a.txt").read_text() == "new"


def interrupted(folder, error):
    with whole_file(folder / "a.txt") as partial:
        partial.write_text("half")
        raise error


def test_an_interruption_leaves_nothing_behind(tmp_path):
    with pytest.raises(KeyboardInterrupt, match="stop"):
        interrupted(tmp_path, KeyboardInterrupt("stop"))
    assert list(tmp_path.iterdir()) == []


def test_a_full_disk_is_told_and_leaves_nothing_behind(tmp_path):
    with pytest.raises(OutputError, match=r"cannot write.*No space left.*disk is full"):
        interrupted(tmp_path, OSError(errno.ENOSPC, os.strerror(errno.ENOSPC)))
    assert list(tmp_path.iterdir()) == []


def test_a_missing_folder_is_told(tmp_path):
    with pytest.raises(OutputError, match=r"cannot write.*folder does not exist"):
        write_text(tmp_path / "no" / "a.txt", "text")


def test_the_checksum_is_that_of_the_bytes(tmp_path):
    (tmp_path / "a").write_bytes(b"abc" * 1000)
    assert sha256_of(tmp_path / "a") == hashlib.sha256(b"abc" * 1000).hexdigest()


def test_json_knows_numpy_dataclasses_and_gaps():
    @dataclass
    class Point:
        x: np.float64
        y: float

    value = {"p": Point(np.float64(0.1), float("nan")), "a": np.arange(3), "path": Path("b")}
    assert json.loads(json_text(value)) == {
        "p": {"x": 0.1, "y": None},
        "a": [0, 1, 2],
        "path": "b",
    }


def test_a_grid_that_is_not_shipped_is_named():
    with pytest.raises(FileNotFoundError, match=r"no shipped grid 'nowhere\.nc'"):
        shipped_grid("nowhere.nc")
