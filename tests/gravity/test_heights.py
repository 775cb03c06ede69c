"""Heights from geopotential numbers: exact tables, round trips, derivatives by differences."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_close, assert_published
from clockgeo import gravity
from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import HeightKind, height_of, heights_of, number_of

LATITUDES = st.floats(-90, 90)
HEIGHTS = st.floats(-4000, 8800)


@pytest.mark.parametrize(
    ("number", "latitude", "height"),
    # closed form of GRS80 at 40 digits
    [(748.0, 52.3, "76.228357"), (19600.0, 46.0, "1999.179742")],
)
def test_normal_height_of_known_numbers(number, latitude, height):
    assert_published(gravity.normal_height(number, latitude), height)
    back = gravity.number_of_normal_height(float(height), latitude)
    assert_close(gravity.normal_height(back, latitude), float(height), tolerance=1e-9)


@pytest.mark.parametrize(
    ("number", "latitude", "height"),
    # U0 - U(h) of GRS80 with mpmath at 40 digits
    [
        (978.017238405057, 0, 100.0),
        (39096.6201903286, 0, 4000.0),
        (9804.65664520083, 45, 1000.0),
        (39304.0938121873, 90, 4000.0),
    ],
)
def test_normal_height_is_exact_by_definition(number, latitude, height):
    # 1e-7 m: a thousandth of the tenth of a millimetre that heights are asked for
    assert_close(gravity.normal_height(number, latitude), height, tolerance=1e-7)


@pytest.mark.parametrize(
    ("latitude", "height", "largest"), [(0, 4000, 0.13e-3), (45, 1000, 0.004e-3), (90, 4000, 3e-6)]
)
def test_textbook_series_differs_as_its_truncation_says(latitude, height, largest):
    """Heiskanen and Moritz's second-order series is an independent second route."""
    a, f, m = 6378137.0, 0.00335281068118, 0.00344978600308
    number = gravity.normal_geopotential_number(latitude, height)
    g0 = gravity.normal_gravity(latitude)
    ratio = number / (a * g0)
    sine2 = np.sin(np.radians(latitude)) ** 2
    series = number / g0 * (1 + (1 + f + m - 2 * f * sine2) * ratio + ratio**2)
    assert abs(series - gravity.normal_height(number, latitude)) < largest


@pytest.mark.parametrize(
    ("number", "g", "height"),
    # H = (-g + sqrt(g² + 4qC))/(2q), q = 0.0424e-5 s-2
    [
        (4900.0, 9.81, "499.47953318686"),
        (9800.0, 9.80, "999.95673843725"),
        (9806.199203, 9.806199203, "999.95676578362"),
        (19600.0, 9.79, "2001.8693389295"),
        (29400.0, 9.78, "3005.7432898860"),
    ],
)
def test_helmert_height(number, g, height):
    # printed digits come from the form that cancels: 1e-9 m
    assert_close(gravity.orthometric_height(number, g), float(height), tolerance=1e-9)


def test_dynamic_height():
    # 10 000 m2 s-2 over the normal gravity at 45 degrees, and over standard gravity
    assert_published(gravity.dynamic_height(10_000.0), "1019.76308996")
    assert_published(gravity.dynamic_height(10_000.0, reference_gravity=9.80665), "1019.71621298")


def test_shallow_helmert_height_does_not_cancel():
    assert gravity.orthometric_height(9.81e-6, 9.81) == pytest.approx(1e-6, rel=1e-12)


@given(HEIGHTS, LATITUDES, st.floats(9.75, 9.85))
def test_round_trips(height, latitude, g):
    number = gravity.number_of_normal_height(height, latitude)
    assert abs(gravity.normal_height(number, latitude) - height) < 1e-8
    number = gravity.number_of_orthometric_height(height, g)
    assert abs(gravity.orthometric_height(number, g) - height) < 1e-9
    number = gravity.number_of_rigorous_height(height, g)
    assert abs(gravity.rigorous_orthometric_height(number, g) - height) < 1e-9
    assert abs(gravity.dynamic_height(gravity.number_of_dynamic_height(height)) - height) < 1e-9


@pytest.mark.parametrize(
    ("kind", "place"),
    [
        ("normal", {"latitude": 46.0}),
        ("orthometric", {"gravity": 9.804}),
        ("orthometric", {"mean_gravity": 9.805}),
        ("dynamic", {}),
    ],
)
def test_derivatives_are_those_of_the_function(kind, place):
    number, step = 19_600.0, 1.0
    height = height_of(number, kind=kind, u=0.5, u_gravity=1e-5, **place)
    high, low = (height_of(number + d, kind=kind, **place).value for d in (step, -step))
    # the second derivative is 1e-8 m per (m2 s-2)²: central differences are exact to rounding
    assert_close(height.per_potential, (high - low) / (2 * step), tolerance=1e-10)
    own = height.per_potential * 0.5
    if "latitude" not in place and place:
        (name, g), d = next(iter(place.items())), 1e-4
        up, down = (height_of(number, kind=kind, **{name: value}).value for value in (g + d, g - d))
        assert_close(height.per_gravity, (up - down) / (2 * d), tolerance=1e-4)
    assert height.u == pytest.approx(np.hypot(own, height.per_gravity * 1e-5))
    back, u = number_of(height.value, kind=kind, u=height.u, **place)
    assert back == pytest.approx(number, abs=1e-6)
    assert u == pytest.approx(height.u / height.per_potential)


def test_all_heights_of_a_site():
    with_gravity = heights_of(19_600.0, latitude=46.0, u=0.1, gravity=9.804)
    assert list(with_gravity) == [HeightKind.NORMAL, HeightKind.ORTHOMETRIC, HeightKind.DYNAMIC]
    assert HeightKind.ORTHOMETRIC not in heights_of(19_600.0, latitude=46.0)
    # 1e-18 is 0.0899 m2 s-2 or 9.2 mm
    height = heights_of(748.0, latitude=52.3, u=0.0898755)[HeightKind.NORMAL]
    assert_published(height.u * 1e3, "9.2")


def test_arrays_go_through():
    numbers = np.array([[0.0, 748.0], [1000.0, 19600.0]])
    assert gravity.normal_height(numbers, [[0.0], [52.3]]).shape == (2, 2)
    assert isinstance(gravity.normal_height(748.0, 52.3), float)
    assert isinstance(gravity.dynamic_height(748.0), float)


def test_bad_input_is_refused():
    with pytest.raises(DataError, match=r"geopotential number out of range: 62636853.4"):
        gravity.normal_height(62_636_853.4, 45.0)
    with pytest.raises(DataError, match=r"height out of range: 29032.0.*feet"):
        gravity.number_of_normal_height(29_032.0, 28.0)
    with pytest.raises(DataError, match=r"gravity out of range: 981000.0.*mGal"):
        gravity.orthometric_height(1000.0, 981_000.0)
    with pytest.raises(ConventionError, match="orthometric heights need the gravity"):
        height_of(748.0, kind="orthometric", latitude=52.3)
    with pytest.raises(ConventionError, match="normal heights need the latitude"):
        height_of(748.0, kind="normal")
    with pytest.raises(ConventionError, match=r"unknown kind of height: 'geodetic'.*normal"):
        height_of(748.0, kind="geodetic")
