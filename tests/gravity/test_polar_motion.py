"""The pole tide: size, sign, table reading and its refusals."""

from __future__ import annotations

import numpy as np
import pytest

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.gravity import Place, PoleCoordinates, pole_tide, read_pole_coordinates
from clockgeo.times import DAY_NS, tai_from_iso

EPOCH = tai_from_iso("2000-01-01T00:00:00Z")
SECULAR_X, SECULAR_Y = 0.0550, 0.3205  # arcsec at 2000.0, IERS Conventions update of 2018
GOOD = """# invented pole
epoch_utc,x_arcsec,y_arcsec
60310,0.1000,0.3000
2024-01-02,0.1100,0.3100
60312.0,0.1300,0.3100
"""


def pole(x, y):
    epochs = np.array([EPOCH, EPOCH + DAY_NS])
    return PoleCoordinates(epochs, np.array([x, x]), np.array([y, y]))


def test_size_at_the_worst_latitude():
    # common knowledge of the field: 0.108 m2 s-2 (1.2e-18) for 0.3" at 45°; two digits
    tide = pole_tide([EPOCH], Place(45.0, 180.0), pole(SECULAR_X + 0.3, SECULAR_Y))
    assert_close(tide[0], 0.108, tolerance=0.0006)


def test_nothing_at_the_secular_pole_the_equator_and_the_poles():
    assert pole_tide([EPOCH], Place(45.0, 0.0), pole(SECULAR_X, SECULAR_Y))[0] == pytest.approx(0)
    for latitude in (0.0, 90.0, -90.0):
        tide = pole_tide([EPOCH], Place(latitude, 20.0), pole(0.4, 0.1))
        assert abs(tide[0]) < 1e-10


def test_it_is_the_change_of_the_centrifugal_potential():
    """Second route: turn the rotation axis and take the difference of Ω² p²/2."""
    place, (x, y) = Place(37.0, -20.0), (0.25, -0.15)
    arcsec, omega = np.pi / 648_000, 7.292115e-5
    axis = np.array([x * arcsec, -y * arcsec, 1.0])
    axis /= np.linalg.norm(axis)
    e2, phi, lam = 0.00669438002290, np.radians(37.0), np.radians(-20.0)
    n = 6378137.0 / np.sqrt(1 - e2 * np.sin(phi) ** 2)
    site = np.array(
        [
            n * np.cos(phi) * np.cos(lam),
            n * np.cos(phi) * np.sin(lam),
            n * (1 - e2) * np.sin(phi),
        ]
    )
    along = np.array([site @ axis, site[2]])
    expected = omega**2 / 2 * (along[1] ** 2 - along[0] ** 2) * (1 + 0.3077 - 0.6207)
    tide = pole_tide([EPOCH], place, pole(SECULAR_X + x, SECULAR_Y + y))
    # second order in the pole: 1e-6 of it
    assert_close(tide[0], expected, tolerance=1e-6)


def test_a_table_is_read_and_interpolated(tmp_path):
    path = tmp_path / "pole.csv"
    path.write_text(GOOD, encoding="utf-8")
    table = read_pole_coordinates(path)
    x, y = table.at(table.tai_ns[0] + DAY_NS // 2)
    assert (x, y) == (pytest.approx(0.105), pytest.approx(0.305))
    with pytest.raises(DataError, match=r"do not cover the record: 2023-12-31.*2024-01-03"):
        table.at(table.tai_ns[0] - 1_000_000)


@pytest.mark.parametrize(
    ("damage", "message"),
    [
        (lambda _: "", "the table is empty"),
        (lambda t: t.splitlines()[1] + "\n", "a header but no rows"),
        (lambda t: t.replace("x_arcsec", "x_mas"), "missing column: x_arcsec"),
        (lambda t: t.replace("y_arcsec", "y_arcsec,dut"), "unknown column: dut"),
        (lambda t: t.replace("0.1100", "abc"), r"1 of 3 rows.*line 4: x_arcsec .*'abc'"),
        (lambda t: t.replace("0.1100", "nan"), r"line 4: x_arcsec is not a finite number"),
        (lambda t: t.replace("0.1100,0.3100", "0.1100"), "line 4: 2 fields instead of 3"),
        (lambda t: t.replace("2024-01-02", "2024-13-02"), "line 4: not a date and time"),
        (lambda t: t.replace("60312.0", "60300.0"), "increasing order.*pole.csv"),
        (lambda t: t.replace("0.1300", "130.0"), r"pole coordinate out of range: 130.0.*milli"),
    ],
)
def test_damaged_tables_are_refused(tmp_path, damage, message):
    path = tmp_path / "pole.csv"
    path.write_text(damage(GOOD), encoding="utf-8")
    with pytest.raises(DataError, match=message) as caught:
        read_pole_coordinates(path)
    assert "pole.csv" in str(caught.value)


def test_a_binary_file_is_refused(tmp_path):
    path = tmp_path / "pole.csv"
    path.write_bytes(bytes(range(256)))
    with pytest.raises(DataError, match="not a text file"):
        read_pole_coordinates(path)
