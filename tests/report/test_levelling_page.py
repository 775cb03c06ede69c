"""The page of level: whole, in order, escaped, self-contained and repeatable."""

from __future__ import annotations

import re
from itertools import pairwise

import pytest

from clockgeo.campaign.evidence import Evidence
from clockgeo.errors import OutputError
from clockgeo.report import PAGE, level_page, write_level_page
from clockgeo.report.page import render_page
from invented_result import invented_evidence, invented_result
from page_structure import Structure

ATTACK = "<script>alert('x')</script>\"'&{{ 7 * 7 }}"


@pytest.fixture(scope="module")
def page(result, evidence):
    return render_page(level_page(result, evidence))


@pytest.fixture(scope="module")
def structure(page):
    return Structure(page)


def test_the_answer_comes_first(page):
    order = [page.index(f'id="{one}"') for one in ("answer-heading", "places", "records", "inputs")]
    assert order == sorted(order)
    flat = page.replace("\u202f", " ").replace("\u00a0", " ")
    answer = flat[: flat.index('id="places"')]
    # u of the invented result: root of the sum of squares of its parts, 0.5099 m² s⁻²
    assert "ΔC = 13 630.72(51) m² s⁻²" in answer
    assert "Kesselin Saddle minus Harbel" in answer
    assert "Zero level: height reference; tide system: zero tide" in answer
    assert "Agrees with geodesy" in answer
    assert "not an official height" in answer


def test_everything_asked_for_is_there(structure):
    headings = [text for _, text in structure.all("h2")]
    assert headings == [
        "Result",
        "Sites and campaign",
        "Records",
        "Screening log",
        "Stability",
        "Uncertainty budget",
        "Correlations",
        "Clocks against geodesy",
        "Do the sessions agree?",
        "Conventions and constants",
        "Inputs",
    ]


def test_headings_go_down_one_step_at_a_time(structure):
    levels = [int(tag[1]) for tag, _, _ in structure.found if re.fullmatch(r"h\d", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after - before <= 1 for before, after in pairwise(levels))


def test_tables_can_be_read_aloud(structure):
    assert structure.all("table")
    assert len(structure.all("caption")) == len(structure.all("table"))
    assert all(attrs.get("scope") in ("col", "row") for attrs, _ in structure.all("th"))


def test_pictures_have_words(structure):
    svgs = structure.all("svg")
    assert len(svgs) == len(structure.all("figcaption")) >= 10
    for attrs, _ in svgs:
        assert attrs["role"] == "img"
        assert attrs["aria-labelledby"]
    assert all(len(text.strip()) > 10 for _, text in structure.all("figcaption"))


def test_ids_are_unique_and_links_lead_somewhere(page):
    ids = re.findall(r'\bid="([^"]*)"', page)
    assert len(set(ids)) == len(ids)
    wanted = re.findall(r'(?:href="#|aria-labelledby="|url\(#)([^")]+)', page)
    assert set(wanted) <= set(ids)


def test_nothing_is_fetched(structure, page):
    for tag, attrs, _ in structure.found:
        for name in ("src", "href", "xlink:href", "data", "action"):
            address = attrs.get(name, "#")
            assert address.startswith(("#", "data:")), (tag, address)
    assert "@import" not in page
    assert "default-src 'none'" in page
    assert len(structure.all("script")) == 1


def test_no_number_is_missing(page):
    text = re.sub(r"<script>.*?</script>", "", page, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\binf\b|None", text)


def test_text_of_users_stays_text():
    evidence = invented_evidence()
    result = invented_result(name=ATTACK, site_name=ATTACK)
    session = result.sessions[0].model_copy(
        update={"id": ATTACK, "numerator_clock": ATTACK, "notes": (ATTACK,)}
    )
    effect = result.effects[0].model_copy(update={"effect": ATTACK})
    result = result.model_copy(
        update={
            "sessions": (session, *result.sessions[1:]),
            "effects": (effect, *result.effects[1:]),
            "notes": (ATTACK,),
        }
    )
    record = evidence.records[0]
    renamed = type(record)(ATTACK, record.tai_ns, record.y, record.reasons, record.interval)
    evidence = Evidence((renamed, *evidence.records[1:]), evidence.groups)
    structure = Structure(render_page(level_page(result, evidence)))
    assert len(structure.all("script")) == 1
    assert ATTACK in [text for _, text in structure.all("h1")]
    assert ATTACK in [text for _, text in structure.all("th")]
    assert any(ATTACK in text for _, text in structure.all("svg"))
    assert all(ATTACK in text for _, text in structure.all("title")[:1])


def test_equal_results_give_equal_bytes(page):
    again = render_page(level_page(invented_result(), invented_evidence()))
    assert again == page


def test_notebooks_show_the_page_in_a_frame(result, evidence, page):
    shown = Structure(level_page(result, evidence)._repr_html_())
    assert [tag for tag, _, _ in shown.found] == ["iframe"]
    assert shown.found[0][1]["srcdoc"] == page


def test_a_campaign_without_comparison_or_second_site(result, evidence):
    lonely = result.model_copy(update={"comparison": (), "scatter": None, "differences": ()})
    text = render_page(level_page(lonely, evidence))
    assert "Clocks against geodesy" not in text


@pytest.mark.parametrize(
    ("error", "word"),
    [(0.4, "Agrees"), (-2.0, "Agrees"), (2.6, "Fits doubtfully"), (-9.0, "Disagrees")],
)
def test_verdicts(result, evidence, error, word):
    line = result.comparison[0].model_copy(update={"normalised_error": error})
    changed = level_page(result.model_copy(update={"comparison": (line,)}), evidence)
    assert changed.answers[0].verdict.startswith(f"{word} with geodesy")
    assert f"{abs(error):.1f} times" in changed.answers[0].verdict


def test_thirty_days_make_a_light_page(result, tmp_path):
    from invented_result import invented_record

    records, sessions = [], []
    for day in range(30):
        start = f"2027-05-{day + 1:02d}T00:00:00Z"
        name = f"day {day + 1}"
        records.append(invented_record(name, start, 24.0, interval=5.0, seed=day))
        sessions.append(
            result.sessions[0].model_copy(
                update={"id": name, "start": start, "stop": start.replace("T00", "T23")}
            )
        )
    month = result.model_copy(update={"sessions": tuple(sessions)})
    path = write_level_page(tmp_path / PAGE, month, Evidence(tuple(records), ()))
    assert path.stat().st_size < 5_000_000


def test_an_existing_page_is_kept(result, evidence, tmp_path):
    path = tmp_path / PAGE
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(OutputError, match="exists already"):
        write_level_page(path, result, evidence)
    assert path.read_text(encoding="utf-8") == "mine"
