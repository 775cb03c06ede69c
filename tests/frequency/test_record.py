"""The record itself, and the face of the package."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest

import clockgeo.frequency
from clockgeo.errors import DataError
from clockgeo.frequency import Record
from clockgeo.times import SECOND_NS


def made(**changed):
    """A good record of three rows with one thing changed."""
    columns = {
        "name": "lab",
        "tai_ns": np.array([0, 1, 3]) * 2 * SECOND_NS,
        "y": np.array([1e-17, np.nan, 3e-17]),
        "usable": np.array([True, False, True]),
        "interval": 2.0,
        "tick": np.array([10, 11, 13]),
    }
    return Record(**{**columns, **changed})


def test_times_counted_by_hand():
    record = made()
    assert len(record) == 3
    assert record.start == 0
    assert record.stop == 8 * SECOND_NS
    assert record.span == 8.0
    assert record.valid_seconds == 4.0
    assert record.uptime == 0.5


def test_usable_rows_and_the_grid():
    tick, y = made().valid()
    assert tick.tolist() == [10, 13]
    assert y.tolist() == [1e-17, 3e-17]
    grid, valid = made().on_grid()
    np.testing.assert_array_equal(grid, [1e-17, np.nan, np.nan, 3e-17])
    assert valid.tolist() == [True, False, False, True]


def test_the_makers_array_stays_his_own():
    y = np.array([1e-17, 2e-17, 3e-17])
    record = made(y=y)
    y.flags.writeable  # noqa: B018  (reading it must not raise)
    y[0] = 5.0
    with pytest.raises(ValueError, match="read-only"):
        record.y[0] = 0.0


@pytest.mark.parametrize(
    ("changed", "problem"),
    [
        ({"y": np.array([1.0, 2.0])}, "columns of one length"),
        ({"u": np.array([1.0, 2.0])}, "columns of one length"),
        ({"interval": 0.0}, "interval must be positive: 0.0"),
        ({"interval": np.nan}, "interval must be positive"),
        ({"tai_ns": np.array([0, 2, 2])}, "epochs do not increase"),
        ({"tick": np.array([10, 9, 13])}, "ticks do not increase"),
        ({"usable": np.array([True, True, True])}, "usable row holds no finite value"),
    ],
)
def test_a_wrong_record_cannot_be_made(changed, problem):
    with pytest.raises(DataError, match=problem):
        made(**changed)


def test_every_public_name_can_be_imported():
    for name in clockgeo.frequency.__all__:
        assert getattr(clockgeo.frequency, name) is not None
    assert set(clockgeo.frequency.__all__) <= set(dir(clockgeo.frequency))


def test_an_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'nonsense'"):
        _ = clockgeo.frequency.nonsense


def test_the_face_is_light():
    code = (
        "import sys, clockgeo.frequency; "
        "print([m for m in ('numpy', 'polars', 'scipy', 'numba', 'netCDF4') if m in sys.modules])"
    )
    told = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert told.stdout.strip() == "[]"
