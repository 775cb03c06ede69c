"""Fixtures for every room of the house."""

from __future__ import annotations

from pathlib import Path

import hypothesis
import numpy as np
import pytest

# The first example may pay for an import; a time limit would fail on a busy machine only.
hypothesis.settings.register_profile("project", deadline=None)
hypothesis.settings.load_profile("project")


@pytest.fixture
def rng() -> np.random.Generator:
    """A generator with a fixed seed, so that a failing draw can be drawn again."""
    return np.random.default_rng(20270301)


@pytest.fixture(scope="session")
def project() -> Path:
    """The top of the source tree."""
    return Path(__file__).resolve().parents[1]


@pytest.fixture(scope="session")
def real_records(project: Path) -> Path:
    """Folder of the published real records that are kept beside the project, never in it."""
    folder = project.parent / "shared" / "records"
    if not folder.is_dir():
        pytest.skip("the published real records are not kept with the project; folder absent")
    return folder


@pytest.fixture(scope="session")
def real_grids(project: Path) -> Path:
    """Folder of national geoid grids that are kept beside the project, never in it."""
    folder = project.parent / "shared" / "grids"
    if not folder.is_dir():
        pytest.skip("the national geoid grids are not kept with the project; folder absent")
    return folder
