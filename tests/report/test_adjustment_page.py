"""The page of adjust: datums first, gaps in words, blunders named."""

from __future__ import annotations

import pytest

from clockgeo.errors import OutputError
from clockgeo.report import PAGE, NetPoint, adjust_page, net_picture, write_adjust_page
from clockgeo.report.page import render_page
from invented_adjustment import invented_adjustment
from page_structure import assert_well_made

ATTACK = "<script>alert('x')</script>\"'&{{ 7 * 7 }}"


@pytest.fixture(scope="module")
def adjusted():
    return invented_adjustment()


@pytest.fixture(scope="module")
def page(adjusted):
    return render_page(adjust_page(adjusted)).replace("\u202f", " ").replace("\u00a0", " ")


def test_it_is_well_made(page):
    structure = assert_well_made(page)
    assert [text for _, text in structure.all("h2")] == [
        "Result",
        "Datums",
        "Network",
        "Clock sessions",
        "Uncertainty budget",
        "Observations: residuals and reliability",
        "What the data cannot tell",
        "Conventions and constants",
        "Inputs",
    ]


def test_the_datums_come_first(page):
    answer = page[: page.index('id="datums"')]
    assert "offset −0.132(18) m" in answer
    # 2.5e-7 m a metre are 0.25 mm a km
    assert "tilt 0.250(40) mm/km north, −0.090(40) mm/km east" in answer
    assert "yes, but 1 suspected of a blunder" in answer
    assert "One observation is suspected of a blunder: line 7." in answer


def test_what_is_not_determined_has_words_and_no_number(page):
    assert "offset not determined by the data" in page
    assert "datum island: offset not estimable" in page
    assert "would show an error: island tie." in page


def test_the_worst_observation_heads_the_table(adjusted):
    from clockgeo.report.adjustment_sheets import observation_sheet

    sheet = observation_sheet(adjusted)
    assert sheet.rows[0][0].text == "line 7"
    assert sheet.rows[-1][5].text == "uncontrolled"
    assert sheet.rows[-1][7].text == "∞"


def test_long_tables_say_that_they_are_cut(adjusted):
    from clockgeo.report.adjustment_sheets import MOST_ROWS, point_sheet

    many = adjusted.model_copy(update={"points": adjusted.points * 10})
    sheet = point_sheet(many)
    assert len(sheet.rows) == MOST_ROWS
    assert "(60 of 320; all in result.json)" in sheet.caption


def test_equal_results_give_equal_bytes(adjusted):
    once, again = (render_page(adjust_page(one)) for one in (adjusted, invented_adjustment()))
    assert once == again


def test_text_of_users_stays_text(adjusted):
    datum = adjusted.datums[0].model_copy(update={"name": ATTACK})
    point = adjusted.points[-1].model_copy(update={"id": ATTACK})
    odd = invented_adjustment(name=ATTACK).model_copy(
        update={
            "datums": (datum, *adjusted.datums[1:]),
            "points": (*adjusted.points[:-1], point),
            "notes": (ATTACK,),
        }
    )
    structure = assert_well_made(render_page(adjust_page(odd)))
    assert ATTACK in [text for _, text in structure.all("h1")]
    assert ATTACK in [text for _, text in structure.all("h3")]
    assert ATTACK in [text for _, text in structure.all("li")]


def test_a_net_without_datums_or_clocks(adjusted):
    bare = adjusted.model_copy(
        update={
            "datums": (),
            "sessions": (),
            "sites": (),
            "differences": (),
            "effects": (),
            "geoid_models": (),
            "robust": None,
            "loops": (),
        }
    )
    structure = assert_well_made(render_page(adjust_page(bare)))
    assert "Datums" not in [text for _, text in structure.all("h2")]


def test_an_existing_page_is_kept(adjusted, tmp_path):
    path = write_adjust_page(tmp_path / PAGE, adjusted)
    with pytest.raises(OutputError, match="exists already"):
        write_adjust_page(path, adjusted)


def test_large_nets_stay_light():
    from clockgeo.report.embedding import inline_svg

    side = 150
    points = [
        NetPoint(f"{n}", 45.0 + n // side / side, 9.0 + n % side / side) for n in range(side**2)
    ]
    lines = [(f"{n}", f"{n + 1}") for n in range(side**2 - 1) if (n + 1) % side]
    svg = inline_svg(net_picture(points, lines), "p", "t")
    assert len(svg) < 1_500_000
