"""The version of the installed package."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version

__all__ = ["__version__"]

try:
    __version__ = version("clockgeo")
except PackageNotFoundError:  # a source tree that was never installed
    __version__ = "0+unknown"
