"""The page in a real browser: silent, offline, light and dark, printed, and inert."""

from __future__ import annotations

import re

import pytest

from clockgeo.report import level_page
from clockgeo.report.page import write_page
from clockgeo.report.style import DARK, LIGHT
from invented_result import invented_evidence, invented_result

ATTACK = "</title><script>document.title = 'taken'</script><img src=x onerror=alert(1)>"


@pytest.fixture(scope="module")
def page_file(tmp_path_factory):
    """A page whose names try to break out."""
    result = invented_result(name=f"Saddle {ATTACK}", site_name=f"Saddle {ATTACK}")
    path = tmp_path_factory.mktemp("page") / "report.html"
    return write_page(path, level_page(result, invented_evidence()))


@pytest.fixture
def opened(browser, page_file):
    browser.events.clear()
    browser.prefer("light")
    browser.open(page_file)
    return browser


def rgb(colour: str) -> str:
    return "rgb({}, {}, {})".format(*(int(colour[i : i + 2], 16) for i in (1, 3, 5)))


def test_it_is_silent_and_asks_for_nothing(opened, page_file):
    assert opened.complaints() == []
    assert [url for url in opened.requests() if not url.startswith("data:")] == [page_file.as_uri()]


def test_names_from_users_stay_text(opened):
    assert opened.value("document.title").startswith("Saddle </title><script>")
    assert opened.value("document.scripts.length") == 1
    assert opened.value("document.images.length") == 0
    assert "<script>" in opened.value("document.querySelector('h1').textContent")
    assert "<script>" in opened.value("document.querySelector('#figure-map svg').textContent")


def test_pictures_and_tables_are_there_and_have_size(opened):
    sizes = opened.value(
        "Array.from(document.querySelectorAll('figure svg'), e => e.getBoundingClientRect().height)"
    )
    assert len(sizes) >= 10
    assert min(sizes) > 100
    assert opened.value("document.querySelectorAll('table tbody tr').length") > 30


def test_it_does_not_scroll_sideways(opened):
    assert opened.value("document.documentElement.scrollWidth <= window.innerWidth")


@pytest.mark.parametrize(("scheme", "palette"), [("light", LIGHT), ("dark", DARK)])
def test_light_and_dark_follow_the_reader(opened, scheme, palette, tmp_path):
    opened.prefer(scheme)
    style = "getComputedStyle(document.body)"
    assert opened.value(f"{style}.backgroundColor") == rgb(palette["paper"])
    assert opened.value(f"{style}.color") == rgb(palette["ink"])
    text = "document.querySelector('#figure-timeline svg text')"
    assert opened.value(f"getComputedStyle({text}).fill") == rgb(palette["ink"])
    assert opened.picture(tmp_path / "page.png")[:4] == b"\x89PNG"


def test_the_switch_changes_the_paper(opened):
    opened.value("document.querySelector('.paper-switch').click()")
    paper = opened.value("getComputedStyle(document.body).backgroundColor")
    assert paper == rgb(DARK["paper"])


def test_pictures_can_be_enlarged(opened):
    width = "document.querySelector('#figure-record-1 svg').getBoundingClientRect().width"
    before = opened.value(width)
    opened.value("document.querySelector('#figure-record-1 button').click()")
    assert opened.value(width) > 2.0 * before
    assert opened.value("document.documentElement.scrollWidth <= window.innerWidth")
    opened.value("document.querySelector('#figure-record-1 button').click()")
    assert opened.value(width) == before


def test_tables_can_be_copied(opened):
    opened.value(
        "window.taken = []; document.execCommand = function () {"
        " window.taken.push(document.activeElement.value); return true; };"
        " Object.defineProperty(navigator, 'clipboard', {value: undefined})"
    )
    opened.value("document.querySelectorAll('#sheet-differences button').forEach(b => b.click())")
    as_text, as_csv = opened.value("window.taken")
    assert as_text.splitlines()[0].startswith("from\tto\tΔC / m² s⁻²")
    assert as_csv.splitlines()[1].startswith("harbel,kesselin,13630.72,")


def test_everything_is_reached_by_keyboard(opened):
    reachable = (
        "Array.from(document.querySelectorAll('a, button, summary, .scroll, pre'))"
        ".every(e => e.tabIndex >= 0)"
    )
    assert opened.value(reachable)


def test_it_prints_on_a4(opened):
    printed = opened.pdf()
    assert printed.startswith(b"%PDF-")
    boxes = re.findall(rb"/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]", printed)
    assert boxes
    for width, height in boxes:
        # 210 mm by 297 mm in points of 1/72 inch, within the pixel it is rounded to
        assert abs(float(width) - 595.3) < 1.0
        assert abs(float(height) - 841.9) < 1.0


def test_the_printed_page_is_light(opened):
    opened.prefer("dark")
    opened.call("Emulation.setEmulatedMedia", media="print")
    paper = opened.value("getComputedStyle(document.body).backgroundColor")
    opened.call("Emulation.setEmulatedMedia", media="")
    assert paper == rgb("#ffffff")
