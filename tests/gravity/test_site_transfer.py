"""From marker to atoms: published and exact values, agreement of the methods, u by simulation."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from checks import assert_close, assert_published
from clockgeo.errors import DataError
from clockgeo.gravity import (
    RockLayer,
    marker_to_atoms,
    normal_field_transfer,
    normal_gravity,
    shaft_transfer,
)


def test_tower_in_the_normal_field():
    # closed form of GRS80 at 40 digits, 35.71° from 30 to 480 m
    transfer = normal_field_transfer(35.71, 30.0, 480.0)
    assert_published(transfer.geopotential_difference, "4408.720269")
    assert transfer.method == "normal_field"


def test_quadratic_term_of_a_tower():
    # common practice, no source: 0.3125 m2 s-2 over 450 m; to the digits of the gradient used
    transfer = marker_to_atoms(450.0, gravity=9.7978, gradient=-3.086e-6)
    assert_published(abs(transfer.quadratic_term), "0.3125")
    exact = normal_field_transfer(35.71, 30.0, 480.0)
    assert_close(exact.quadratic_term, -0.3125, tolerance=2e-4)


def test_first_tower_experiment():
    # common practice, no source: 22.6 m gives 2.46e-15 one way
    difference = marker_to_atoms(22.6, gravity=9.804).geopotential_difference
    assert_close(difference / 299_792_458.0**2, 2.46e-15, tolerance=0.01e-15)


@given(st.floats(-20.0, 20.0), st.floats(-60.0, 60.0), st.floats(0.0, 3000.0))
def test_gradient_and_closed_form_agree_over_short_distances(dz, latitude, height):
    g = normal_gravity(latitude, height)
    by_gradient = marker_to_atoms(dz, gravity=g)
    closed = normal_field_transfer(latitude, height, height + dz)
    # the mean free-air gradient is within 0.3 % of the local one, 2e-6 over 20 m
    assert by_gradient.geopotential_difference == pytest.approx(
        closed.geopotential_difference, abs=5e-6
    )
    assert float(by_gradient) == by_gradient.geopotential_difference


@given(st.floats(-300.0, 300.0), st.floats(9.77, 9.83), st.floats(-4e-6, -2e-6))
def test_up_and_down_cancel(dz, gravity, gradient):
    there = marker_to_atoms(dz, gravity=gravity, gradient=gradient)
    back = marker_to_atoms(-dz, gravity=there.gravity_at_end, gradient=gradient)
    assert float(there) == pytest.approx(-float(back), abs=1e-9)


def test_uncertainty_by_simulation(rng):
    draws = 20_000
    dz, g, slope = 200.0, 9.81, -3.0e-6
    stated = marker_to_atoms(
        dz, gravity=g, gradient=slope, u_dz=0.002, u_gravity=1e-4, u_gradient=3e-7
    ).u
    heights = dz + 0.002 * rng.standard_normal(draws)
    gravities = g + 1e-4 * rng.standard_normal(draws)
    slopes = slope + 3e-7 * rng.standard_normal(draws)
    scatter = np.std(gravities * heights + slopes * heights**2 / 2)
    # a standard deviation from 20 000 draws is good to 0.5 %
    assert scatter == pytest.approx(stated, rel=0.02)


def test_an_unmeasured_gradient_costs_u():
    assert marker_to_atoms(100.0, gravity=9.81).u == pytest.approx(0.00155)
    assert marker_to_atoms(100.0, gravity=9.81, gradient=-3e-6).u == 0.0


def test_rock_changes_the_gradient_as_poincare_and_prey_say():
    # -3.086e-6 + 4 pi G rho = -0.8466e-6 s-2 for 2670 kg m-3
    shaft = shaft_transfer([RockLayer(thickness=1000.0, density=2670.0)], gravity=9.80)
    assert_close(shaft.gravity_at_end - 9.80, 0.8466e-3, tolerance=0.0006e-3)
    assert_close(shaft.geopotential_difference, -(9800.0 + 0.4233), tolerance=0.0003)


def test_layers_join_and_an_open_hall_is_free_air():
    thick = shaft_transfer([RockLayer(thickness=300.0, density=2500.0)], gravity=9.81)
    thin = shaft_transfer([RockLayer(thickness=100.0, density=2500.0)] * 3, gravity=9.81)
    assert float(thin) == pytest.approx(float(thick), abs=1e-9)
    hall = shaft_transfer([RockLayer(thickness=30.0, density=0.0)], gravity=9.81, direction="up")
    assert float(hall) == pytest.approx(float(marker_to_atoms(30.0, gravity=9.81)), abs=1e-12)


def test_shaft_up_undoes_shaft_down():
    layers = [RockLayer(thickness=50.0, density=1900.0), RockLayer(thickness=120.0, density=2800.0)]
    down = shaft_transfer(layers, gravity=9.81)
    up = shaft_transfer(layers[::-1], gravity=down.gravity_at_end, direction="up")
    assert float(up) == pytest.approx(-float(down), abs=1e-9)


def test_shaft_uncertainty_by_simulation(rng):
    layers = [
        RockLayer(thickness=200.0, density=2300.0, u_density=150.0),
        RockLayer(thickness=400.0, density=2700.0, u_density=60.0),
    ]
    options = {"gravity": 9.81, "u_gradient": 0.0}
    stated = shaft_transfer(layers, **options).u
    scatter = np.std(
        [
            float(
                shaft_transfer(
                    [
                        RockLayer(
                            thickness=layer.thickness,
                            density=layer.density + layer.u_density * rng.standard_normal(),
                        )
                        for layer in layers
                    ],
                    **options,
                )
            )
            for _ in range(3000)
        ]
    )
    # 3000 draws: 1.3 %
    assert scatter == pytest.approx(stated, rel=0.05)


def test_bad_input_is_refused():
    with pytest.raises(DataError, match="at most 2000 m high: 9999"):
        marker_to_atoms(9999.0, gravity=9.81)
    with pytest.raises(DataError, match=r"gradient out of range: -0.3086.*mGal/m"):
        marker_to_atoms(1.0, gravity=9.81, gradient=-0.3086)
    with pytest.raises(DataError, match=r"gravity out of range: 981.0"):
        marker_to_atoms(1.0, gravity=981.0)
    with pytest.raises(DataError, match="uncertainty must not be negative: -1"):
        marker_to_atoms(1.0, gravity=9.81, u_dz=-1.0)
    with pytest.raises(DataError, match="at least one layer"):
        shaft_transfer([], gravity=9.81)
    with pytest.raises(DataError, match="unknown direction: 'left'"):
        shaft_transfer([RockLayer(thickness=1.0)], gravity=9.81, direction="left")
    with pytest.raises(ValidationError, match="thickness"):
        RockLayer(thickness=-1.0)
