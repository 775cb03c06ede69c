"""The examples in the docstrings of the gravity wing give what they say."""

from __future__ import annotations

import doctest
import importlib
import pkgutil

import pytest

from clockgeo import gravity

MODULES = sorted(module.name for module in pkgutil.iter_modules(gravity.__path__))


@pytest.mark.parametrize("name", MODULES)
def test_examples(name):
    failed, _ = doctest.testmod(importlib.import_module(f"clockgeo.gravity.{name}"))
    assert failed == 0
