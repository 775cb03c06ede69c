"""Compiled functions that a command need not compile again at each start."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

import numba

__all__ = ["compiled"]

Kernel = TypeVar("Kernel", bound=Callable[..., object])


def compiled(kernel: Kernel) -> Kernel:
    """Compile a function of numbers and arrays at its first call; keep the machine code on disk.

    The code is kept beside the source or, where that is read-only, in the user's cache; where
    neither can be written the function is compiled anew by each process.
    """
    try:
        done: Kernel = numba.njit(cache=True)(kernel)
    except RuntimeError:  # there is no place to keep it
        done = numba.njit(kernel)
    return done
