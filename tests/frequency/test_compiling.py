"""Compiled functions keep working where their machine code cannot be kept."""

from __future__ import annotations

import numba
import numpy as np

from clockgeo.frequency.compiling import compiled


def total(values):
    acc = 0.0
    for value in values:
        acc += value
    return acc


def test_without_a_place_for_the_cache_functions_are_compiled_all_the_same(monkeypatch):
    compile_ = numba.njit

    def refuse_to_cache(*kernels, cache=False, **options):
        decorated = compile_(*kernels, **options)
        if not cache:
            return decorated

        def fail(kernel):
            message = "cannot cache function: no locator available"
            raise RuntimeError(message)

        return fail

    monkeypatch.setattr(numba, "njit", refuse_to_cache)
    assert compiled(total)(np.array([1.0, 2.0, 3.5])) == 6.5


def test_not_a_number_is_passed_on():
    # Sums may be reordered; NaN must not be assumed away.
    assert np.isnan(compiled(total)(np.array([1.0, np.nan])))
