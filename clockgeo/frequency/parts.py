"""Long columns in parts that stay in the processor's cache, with no large temporary arrays."""

from __future__ import annotations

from collections.abc import Iterator

__all__ = ["in_parts"]

_ROWS = 1 << 16


def in_parts(count: int) -> Iterator[slice]:
    """Yield slices of at most 65 536 rows that cover ``range(count)``.

    >>> [(part.start, part.stop) for part in in_parts(70_000)]
    [(0, 65536), (65536, 70000)]
    """
    for start in range(0, count, _ROWS):
        yield slice(start, min(start + _ROWS, count))
