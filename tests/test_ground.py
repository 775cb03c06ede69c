"""Errors, constants and progress: the ground everything stands on."""

from __future__ import annotations

import pytest

from clockgeo.constants import Constant
from clockgeo.errors import CampaignError, ClockgeoError, DataError
from clockgeo.progress import shown_by, track


def test_an_error_says_what_value_where_allowed_and_next():
    error = DataError("too steep", value=95, where="site a", allowed="-90..90", advice="Turn it")
    assert str(error) == "too steep: 95 (at site a). -90..90. Turn it."
    assert isinstance(error, ClockgeoError)


def test_an_error_may_leave_parts_out():
    assert str(DataError("empty file", where="a.txt")) == "empty file (at a.txt)."


def test_a_document_error_lists_every_problem():
    error = CampaignError(["first", "second"], where="c.toml")
    assert str(error) == "the campaign document has 2 problems (at c.toml).\n  - first\n  - second"


def test_a_constant_needs_a_source_and_a_u():
    with pytest.raises(ValueError, match=r"constant g has no source"):
        Constant("g", 9.8, "m s-2", 0.0, " ")
    with pytest.raises(ValueError, match=r"constant g has u = -1\.0"):
        Constant("g", 9.8, "m s-2", -1.0, "somewhere")


def test_progress_is_silent_without_a_listener():
    assert list(track([1, 2, 3], "counting")) == [1, 2, 3]


def test_a_listener_hears_label_and_total():
    heard = []

    def listener(steps, label, total):
        heard.append((label, total))
        return steps

    with shown_by(listener):
        assert list(track([1, 2], "counting")) == [1, 2]
        assert list(track(iter("ab"), "letters", 2)) == ["a", "b"]
    assert heard == [("counting", 2), ("letters", 2)]
    assert list(track([1], "after")) == [1]
    assert len(heard) == 2
