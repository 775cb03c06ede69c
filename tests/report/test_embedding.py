"""Pictures as files and as part of a page."""

from __future__ import annotations

import re
from xml.etree import ElementTree as ET

import matplotlib as mpl
import pytest

from clockgeo.errors import DataError, OutputError
from clockgeo.report.embedding import PICTURE_SUFFIXES, inline_svg, save_picture
from clockgeo.report.style import LIGHT, blank, label_axes, picture

TRICKY = 'id="a" #283556 1.23456 url(#x) <script>alert(1)</script> $x_1$ & style="fill: #283556"'


@picture
def drawn(title="a title"):
    figure, axes = blank()
    axes.plot([0.123456, 1.0], [0.0, 1.0], "o-", color=LIGHT["slate"])
    axes.bar([0.5], [0.5], facecolor=LIGHT["clay"], hatch="////")
    label_axes(axes, "time / s", "height / m", title)
    return figure


def elements(text):
    return list(ET.fromstring(text).iter())


@pytest.mark.parametrize("suffix", PICTURE_SUFFIXES)
def test_equal_figures_give_equal_files(tmp_path, suffix):
    first = save_picture(drawn(), tmp_path / f"a{suffix}").read_bytes()
    second = save_picture(drawn(), tmp_path / f"b{suffix}").read_bytes()
    assert first == second
    assert len(first) > 1000


def test_the_users_own_settings_change_nothing(tmp_path):
    plain = save_picture(drawn(), tmp_path / "a.svg").read_bytes()
    with mpl.rc_context({"font.size": 20, "axes.facecolor": "red", "svg.fonttype": "path"}):
        other = save_picture(drawn(), tmp_path / "b.svg").read_bytes()
        assert mpl.rcParams["font.size"] == 20
    assert plain == other


def test_other_suffixes_are_refused(tmp_path):
    with pytest.raises(DataError, match=r"no such kind of picture: 'a.gif'.*\.png, \.svg, \.pdf"):
        save_picture(drawn(), tmp_path / "a.gif")


def test_a_picture_is_not_overwritten_by_accident(tmp_path):
    path = save_picture(drawn(), tmp_path / "a.png")
    with pytest.raises(OutputError, match="exists already"):
        save_picture(drawn(), path)
    save_picture(drawn(), path, replace=True)


def test_text_of_users_is_never_touched():
    texts = [e.text for e in elements(inline_svg(drawn(TRICKY), "p1", TRICKY))]
    assert texts.count(TRICKY) == 2  # the heading in the picture, and its title


def test_ids_are_prefixed_and_found():
    svg = inline_svg(drawn(), "p1", "t")
    ids = re.findall(r'\bid="([^"]*)"', svg)
    assert len(set(ids)) == len(ids)
    assert all(one.startswith("p1-") for one in ids)
    wanted = re.findall(r'url\(#([^)]*)\)|href="#([^"]*)"', svg)
    assert wanted
    assert {a or b for a, b in wanted} <= set(ids)


def test_colours_follow_the_page():
    svg = inline_svg(drawn(), "p1", "t")
    assert "var(--slate)" in svg
    assert "var(--clay)" in svg
    assert not re.search(r"#[0-9a-f]{6}\b", svg)


def test_screen_readers_find_what_it_shows():
    root = elements(inline_svg(drawn(), "p1", "what it shows"))[0]
    assert root.get("role") == "img"
    title = next(e for e in root.iter() if e.tag.endswith("title"))
    assert root.get("aria-labelledby") == title.get("id")
    assert title.text == "what it shows"
