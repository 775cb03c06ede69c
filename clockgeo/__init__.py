"""From optical clock comparisons to geopotential differences, heights and datums."""

from importlib.metadata import PackageNotFoundError, version

try:
    __version__ = version("clockgeo")
except PackageNotFoundError:  # a source tree that was never installed
    __version__ = "0+unknown"

__all__ = ["__version__"]
