"""The face of the gravity wing: lazy, complete, and free of clashes with its modules."""

from __future__ import annotations

import pkgutil
import subprocess
import sys

import pytest

from clockgeo import gravity


def test_every_name_resolves_and_is_listed():
    assert list(gravity.__all__) == sorted(gravity.__all__)
    assert set(gravity.__all__) == set(gravity._HOME)
    for name in gravity.__all__:
        assert getattr(gravity, name) is not None
    assert set(gravity.__all__) <= set(dir(gravity))


def test_no_public_name_is_a_module():
    """A function named like its module would be hidden by the module once that is imported."""
    modules = {module.name for module in pkgutil.iter_modules(gravity.__path__)}
    assert not modules & set(gravity.__all__)


def test_unknown_names_are_refused():
    with pytest.raises(AttributeError, match="has no attribute 'gravitas'"):
        gravity.gravitas  # noqa: B018


def test_importing_the_face_imports_nothing_heavy():
    check = (
        "import sys, clockgeo.gravity\n"
        "heavy = {'numpy', 'scipy', 'boule', 'xarray', 'erfa'} & set(sys.modules)\n"
        "assert not heavy, heavy\n"
    )
    subprocess.run([sys.executable, "-c", check], check=True)
