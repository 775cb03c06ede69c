"""Interpolation: exact fields, an independent second route, order of the error, gaps."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import GridTile
from clockgeo.gravity.interpolation import METHODS, checked_interpolation

ORDERS = {"bilinear": 2, "biquadratic": 3, "bicubic": 3}
places = st.floats(0.0, 5.0, allow_nan=False)


def tile(values, south=10.0, west=20.0, step=1.0):
    return GridTile(south, west, step, step, np.asarray(values, dtype=np.float64))


def at(grid, row, column, method):
    row, column = np.atleast_1d(row).astype(float), np.atleast_1d(column).astype(float)
    values, inside = grid.sample("values", grid.south + row, grid.west + column, method)
    assert inside.all()
    return values


def nodes(function, rows=6, columns=6):
    row, column = np.meshgrid(np.arange(rows), np.arange(columns), indexing="ij")
    return function(row.astype(float), column.astype(float))


@pytest.mark.parametrize("method", METHODS)
@given(row=places, column=places)
def test_linear_fields_are_exact(method, row, column):
    def plane(y, x):
        return 3.0 - 0.7 * y + 1.3 * x

    assert at(tile(nodes(plane)), row, column, method) == pytest.approx(plane(row, column))


@pytest.mark.parametrize("method", ["biquadratic", "bicubic"])
@given(row=places, column=places)
def test_quadratic_fields_are_exact_up_to_the_edges(method, row, column):
    def bowl(y, x):
        return 0.3 * y**2 - 0.2 * x**2 + 0.5 * x * y - x + 2.0

    assert at(tile(nodes(bowl)), row, column, method) == pytest.approx(bowl(row, column), abs=1e-11)


@pytest.mark.parametrize("method", METHODS)
def test_nodes_keep_their_values(method, rng):
    values = rng.normal(size=(6, 7))
    row, column = np.meshgrid(np.arange(6), np.arange(7), indexing="ij")
    assert np.allclose(at(tile(values), row.ravel(), column.ravel(), method), values.ravel())


def keys_kernel(s):
    """Keys 1981, cubic convolution kernel with a = -1/2, as a function of distance."""
    s = abs(s)
    if s <= 1.0:
        return 1.5 * s**3 - 2.5 * s**2 + 1.0
    return -0.5 * s**3 + 2.5 * s**2 - 4.0 * s + 2.0 if s < 2.0 else 0.0


def test_bicubic_is_the_convolution_with_the_kernel(rng):
    values = rng.normal(size=(8, 9))
    for row, column in rng.uniform(2.0, 5.0, (20, 2)):
        expected = sum(
            keys_kernel(row - i) * keys_kernel(column - j) * values[i, j]
            for i in range(8)
            for j in range(9)
        )
        assert at(tile(values), row, column, "bicubic") == pytest.approx(expected, abs=1e-12)


def test_biquadratic_is_the_parabola_through_the_nearest_nodes(rng):
    values = rng.normal(size=(8, 9))
    for row, column in rng.uniform(1.0, 6.0, (20, 2)):
        i, j = round(row), round(column)
        lines = [
            np.polyval(np.polyfit([j - 1, j, j + 1], values[k, j - 1 : j + 2], 2), column)
            for k in (i - 1, i, i + 1)
        ]
        expected = np.polyval(np.polyfit([i - 1, i, i + 1], lines, 2), row)
        assert at(tile(values), row, column, "biquadratic") == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(("method", "order"), ORDERS.items())
def test_the_error_falls_with_the_order_of_the_method(method, order, rng):
    """Half the step leaves 2^-order of the error of a smooth field."""

    def wave(y, x):
        return np.sin(y / 3.0 + 0.4) * np.cos(x / 2.5)

    row, column = rng.uniform(3.0, 12.0, (2, 2000))
    errors = []
    for step in (1.0, 0.5):
        count = int(15 / step) + 1
        grid = tile(nodes(lambda y, x, s=step: wave(y * s, x * s), count, count), step=step)
        values, _ = grid.sample("values", 10.0 + row, 20.0 + column, method)
        errors.append(np.sqrt(np.mean((values - wave(row, column)) ** 2)))
    assert errors[0] / errors[1] == pytest.approx(2.0**order, rel=0.15)


@pytest.mark.parametrize("method", METHODS)
def test_a_gap_reaches_as_far_as_the_method_and_no_further(method):
    values = np.ones((12, 12))
    values[6, 6] = np.nan
    reach = {"bilinear": 1.0, "biquadratic": 1.5, "bicubic": 2.0}[method]
    row = np.linspace(0.05, 10.95, 110)
    found = at(tile(values), row, np.full(row.size, 6.0), method)
    assert np.array_equal(np.isnan(found), np.abs(row - 6.0) < reach)


def test_a_point_on_a_node_needs_no_neighbour():
    values = np.full((4, 4), np.nan)
    values[1, 2] = 7.0
    for method in METHODS:
        # a coordinate that rounding moved by 1e-12 of a cell is still on its node
        assert at(tile(values), 1.0 + 1e-12, 2.0 - 1e-12, method) == pytest.approx(7.0)


@pytest.mark.parametrize("method", ["biquadratic", "bicubic"])
def test_two_rows_are_enough_for_bilinear_only(method):
    narrow = tile(np.ones((2, 5)))
    assert at(narrow, 0.5, 1.5, "bilinear") == 1.0
    assert np.isnan(at(narrow, 0.5, 1.5, method))


def test_unknown_methods_and_shapes_are_refused():
    with pytest.raises(ConventionError, match=r"unknown interpolation: 'nearest'.*bicubic"):
        checked_interpolation("nearest")
    with pytest.raises(DataError, match=r"not the shape of a lattice: \(1, 4\)"):
        tile(np.ones((1, 4)))
    with pytest.raises(DataError, match="steps of a lattice must be positive"):
        tile(np.ones((3, 4)), step=0.0)
    with pytest.raises(DataError, match="u and rate of the same shape"):
        GridTile(0.0, 0.0, 1.0, 1.0, np.ones((3, 4)), u=np.ones((4, 3)))
