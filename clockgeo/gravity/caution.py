"""The caution that goes with every height and every redshift."""

from __future__ import annotations

__all__ = ["CAUTION"]

CAUTION = (
    "These values are a computation, not an official height. Where a national height system or a "
    "time-scale authority has stated values for a place, theirs prevail."
)
"""One text for the terminal, the report and the result files."""
