"""Compiled functions that a command need not compile again at each start."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

import numba

__all__ = ["compiled"]

_REORDERED = {"reassoc", "contract", "nsz"}
Kernel = TypeVar("Kernel", bound=Callable[..., object])


def compiled(kernel: Kernel) -> Kernel:
    """Compile a function of numbers and arrays at its first call; keep the machine code on disk.

    The code is kept beside the source or, where that is read-only, in the user's cache; where
    neither can be written the function is compiled anew by each process. Sums may be taken in
    another order, so that several numbers are added at once; nothing is assumed of NaN or infinity.
    """
    try:
        done: Kernel = numba.njit(cache=True, fastmath=_REORDERED)(kernel)
    except RuntimeError:  # there is no place to keep it
        done = numba.njit(fastmath=_REORDERED)(kernel)
    return done
