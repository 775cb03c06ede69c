"""A page's pictures as files."""

from __future__ import annotations

import pytest

from clockgeo.errors import DataError, OutputError
from clockgeo.report import level_page, prepare_figures, write_figures


@pytest.fixture(scope="module")
def page(result, evidence):
    return level_page(result, evidence)


def test_every_picture_becomes_a_file(page, tmp_path):
    paths = write_figures(page, tmp_path / "new" / "figures", suffix=".svg")
    names = [path.name for path in paths]
    assert names[:2] == ["map.svg", "timeline.svg"]
    assert len(names) == len(set(names)) == 11
    assert all(path.stat().st_size > 1000 for path in paths)


def test_pictures_of_an_earlier_run_are_kept(tmp_path):
    (tmp_path / "map.png").write_bytes(b"mine")
    with pytest.raises(OutputError, match="exists already"):
        prepare_figures(tmp_path, suffix=".png")
    prepare_figures(tmp_path, suffix=".svg")
    prepare_figures(tmp_path, suffix=".png", replace=True)


def test_other_kinds_and_folders_are_refused(tmp_path):
    with pytest.raises(DataError, match="no such kind of picture"):
        prepare_figures(tmp_path, suffix=".gif")
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with pytest.raises(OutputError, match="cannot make the folder of pictures"):
        prepare_figures(tmp_path / "file" / "below", suffix=".png")
