"""Progress of long work, told to whoever listens.

The library says how far it is with `track`; it never prints. The terminal layer installs a
listener with `shown_by`; without one, `track` is a plain iterator.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from typing import TypeVar

__all__ = ["Listener", "shown_by", "track"]

T = TypeVar("T")
Listener = Callable[[Iterable[T], str, int | None], Iterable[T]]
_listener: ContextVar[Listener | None] = ContextVar("progress_listener", default=None)  # type: ignore[type-arg]


def track(steps: Iterable[T], label: str, total: int | None = None) -> Iterator[T]:
    """Yield `steps` one by one while the listener, if any, shows how far the work is.

    Parameters
    ----------
    steps : iterable
        The work to do, a step an item.
    label : str
        What is being done, in a few words.
    total : int, optional
        Number of steps where `steps` has no length of its own.
    """
    listener = _listener.get()
    if total is None and hasattr(steps, "__len__"):
        total = len(steps)  # type: ignore[arg-type]
    yield from steps if listener is None else listener(steps, label, total)


@contextmanager
def shown_by(listener: Listener) -> Iterator[None]:  # type: ignore[type-arg]
    """Let `listener(steps, label, total)` wrap every `track` within the block."""
    token = _listener.set(listener)
    try:
        yield
    finally:
        _listener.reset(token)
