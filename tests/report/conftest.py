"""Fixtures for pages and pictures."""

from __future__ import annotations

import pytest

from browser import Browser, find_browser, started
from invented_result import invented_evidence, invented_result


@pytest.fixture(scope="session")
def result():
    return invented_result()


@pytest.fixture(scope="session")
def evidence():
    return invented_evidence()


@pytest.fixture(scope="session")
def browser(tmp_path_factory) -> Browser:
    program = find_browser()
    if program is None:
        pytest.skip("no Chromium here; apt-get install chromium to test pages in a browser")
    with started(program, tmp_path_factory.mktemp("profile")) as page:
        yield page
