"""The face of a package: public names that are imported when they are first used."""

from __future__ import annotations

import importlib
from collections.abc import Callable, Mapping
from typing import Any

__all__ = ["lazy_face"]


def lazy_face(
    package: str, homes: Mapping[str, str]
) -> tuple[Callable[[str], Any], Callable[[], list[str]]]:
    """Make `__getattr__` and `__dir__` of a package, so that importing it costs nothing.

    Parameters
    ----------
    package : str
        Its `__name__`.
    homes : mapping
        Public name -> module of the package that holds it. No name may equal a module's: the
        package would hand out the module once that is imported.

    Returns
    -------
    (callable, callable)
        The functions of PEP 562.
    """

    def attribute(name: str) -> Any:
        if name not in homes:
            message = f"module {package!r} has no attribute {name!r}"
            raise AttributeError(message)
        return getattr(importlib.import_module(f"{package}.{homes[name]}"), name)

    def names() -> list[str]:
        module = importlib.import_module(package)
        return sorted([*vars(module), *homes])

    return attribute, names
