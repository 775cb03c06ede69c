"""The page of plan: whole, in order, escaped, self-contained."""

from __future__ import annotations

import re

import pytest

from clockgeo.campaign import read_document
from clockgeo.errors import OutputError
from clockgeo.planning import plan
from clockgeo.planning.results import ConfirmationResult, ConfirmedTarget
from clockgeo.report import plan_page, write_plan_page
from clockgeo.report.page import render_page
from page_structure import Structure

ATTACK = "<script>alert('x')</script>\"'&{{ 7 * 7 }}"


@pytest.fixture(scope="module")
def planned(project):
    return plan(read_document(project / "examples" / "lantern-islands" / "campaign.toml")).result


@pytest.fixture(scope="module")
def line(project):
    return plan(read_document(project / "examples" / "harrow-line" / "campaign.toml")).result


@pytest.fixture(scope="module")
def page(planned):
    return render_page(plan_page(planned))


def headings(text):
    return [title for _, title in Structure(text).all("h2")]


def test_the_answer_comes_first(page):
    flat = page.replace("\u202f", " ").replace("\u00a0", " ")
    answer = flat[: flat.index('id="targets"')]
    assert "Offset of datums, main to north" in answer
    assert "wanted 20.0 mm" in answer
    assert "Reached: u is" in answer
    assert "not an official height" in answer


def test_everything_asked_for_is_there(page, line):
    assert headings(page) == [
        "Result",
        "Targets and what limits them",
        "Best use of the days",
        "Schedule",
        "Predicted uncertainty budget",
        "What helps most",
        "Conventions and constants",
        "Inputs",
    ]
    assert "Other techniques" in headings(render_page(plan_page(line)))


def test_pictures_and_tables_have_words(page):
    structure = Structure(page)
    svgs = structure.all("svg")
    # For each of three targets the reach and the budget; the map and the timeline.
    assert len(svgs) == len(structure.all("figcaption")) == 8
    assert all(attrs["role"] == "img" and attrs["aria-labelledby"] for attrs, _ in svgs)
    assert len(structure.all("caption")) == len(structure.all("table"))


def test_ids_are_unique_and_links_lead_somewhere(page):
    ids = re.findall(r'\bid="([^"]*)"', page)
    assert len(set(ids)) == len(ids)
    wanted = re.findall(r'(?:href="#|aria-labelledby="|url\(#)([^")]+)', page)
    assert set(wanted) <= set(ids)


def test_no_number_is_missing(page):
    text = re.sub(r"<script>.*?</script>", "", page, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\binf\b|None", text)


def test_simulations_are_told(planned):
    one = ConfirmedTarget(
        from_end="main",
        to_end="north",
        predicted_u=0.019,
        realised_u=0.0203,
        lower=0.0172,
        upper=0.0210,
        stated_u=0.0205,
        agrees=True,
    )
    done = ConfirmationResult(runs=200, seed=1, targets=(one,))
    text = render_page(plan_page(planned.model_copy(update={"confirmation": done})))
    flat = text.replace("\u202f", " ").replace("\u00a0", " ")
    assert "In 200 simulated campaigns the results scattered by 20.3 mm" in flat
    assert "Simulated campaigns" in headings(text)


def test_text_of_users_stays_text(planned):
    session = planned.sessions[0].model_copy(update={"id": ATTACK, "numerator_clock": ATTACK})
    limit = planned.limits[0].model_copy(update={"text": ATTACK})
    result = planned.model_copy(
        update={
            "name": ATTACK,
            "sessions": (session, *planned.sessions[1:]),
            "limits": (limit, *planned.limits[1:]),
            "notes": (ATTACK,),
        }
    )
    structure = Structure(render_page(plan_page(result)))
    assert len(structure.all("script")) == 1
    assert ATTACK in [text for _, text in structure.all("h1")]


def test_equal_plans_give_equal_bytes(planned, page):
    assert render_page(plan_page(planned)) == page


def test_an_existing_page_is_kept(planned, tmp_path):
    path = tmp_path / "report.html"
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(OutputError, match="exists already"):
        write_plan_page(path, planned)
    assert path.read_text(encoding="utf-8") == "mine"
    assert write_plan_page(path, planned, replace=True) == path
