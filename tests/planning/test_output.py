"""Plans on disk: back through the library, and refused when damaged."""

from __future__ import annotations

import pytest

from clockgeo.campaign import read_document
from clockgeo.errors import DataError
from clockgeo.planning import plan, read_plan, write_plan


@pytest.fixture(scope="module")
def planned(project):
    return plan(read_document(project / "examples" / "harrow-line" / "campaign.toml"))


def test_a_plan_comes_back_as_it_went(planned, tmp_path):
    write_plan(planned.result, planned.sessions, tmp_path)
    assert read_plan(tmp_path) == planned.result
    assert read_plan(tmp_path / "plan.json") == planned.result


def test_missing_and_damaged_plans_are_refused(planned, tmp_path):
    with pytest.raises(DataError, match="no plan here"):
        read_plan(tmp_path)
    write_plan(planned.result, planned.sessions, tmp_path)
    path = tmp_path / "plan.json"
    path.write_text(path.read_text(encoding="utf-8")[:-30], encoding="utf-8")
    with pytest.raises(DataError, match="not a plan of clockgeo"):
        read_plan(tmp_path)
