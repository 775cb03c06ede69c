"""Vertical offset and slope: the registry's worked example, another implementation, round trips."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Transformer

from checks import assert_published
from clockgeo.errors import DataError
from clockgeo.network.epsg1046 import OffsetAndSlope, read_wkt, write_wkt

# IOGP Publication 373-7-2, Vertical Offset and Slope, example LN02 to EVRF2000 (parameters and
# point from memory, result as in the note).
EXAMPLE = OffsetAndSlope(46.0 + 55.0 / 60.0, 8.0 + 11.0 / 60.0, -0.245, -0.210, -0.032)
POINT = 47.0 + 20.0 / 60.0, 9.0 + 40.0 / 60.0


def test_the_registrys_example():
    assert_published(473.0 + EXAMPLE.shift(*POINT), "472.69")


def test_against_another_implementation():
    """PROJ's vertoffset on GRS80, at many points."""
    pipeline = Transformer.from_pipeline(
        f"+proj=vertoffset +lat_0={EXAMPLE.latitude!r} +lon_0={EXAMPLE.longitude!r} "
        f"+dh={EXAMPLE.offset!r} +slope_lat={EXAMPLE.inclination_latitude!r} "
        f"+slope_lon={EXAMPLE.inclination_longitude!r} +ellps=GRS80"
    )
    rng = np.random.default_rng(3)
    latitude, longitude = rng.uniform(44.0, 50.0, 200), rng.uniform(5.0, 12.0, 200)
    theirs = pipeline.transform(
        np.radians(longitude), np.radians(latitude), np.zeros(200), radians=True
    )[2]
    np.testing.assert_allclose(EXAMPLE.shift(latitude, longitude), theirs, atol=1e-6)


@given(
    st.floats(-80.0, 80.0),
    st.floats(-180.0, 180.0),
    st.floats(-2.0, 2.0),
    st.floats(-1e-6, 1e-6),
    st.floats(-1e-6, 1e-6),
)
def test_export_and_import_give_the_same_heights(latitude, longitude, offset, north, east):
    operation = OffsetAndSlope.from_tilts((latitude, longitude), offset, north, east)
    again = read_wkt(write_wkt(operation, source="old", target='new "zero"', accuracy=0.02))
    at = (latitude * 0.9, longitude * 0.9)
    # The claim is 0.1 mm; text holds all digits, so far less is lost.
    assert again.shift(*at) == pytest.approx(operation.shift(*at), abs=1e-6)


def test_text_that_is_no_such_operation_is_refused():
    with pytest.raises(DataError, match="not the WKT of a coordinate operation"):
        read_wkt("not WKT")
    wkt = write_wkt(EXAMPLE, source="a", target="b")
    with pytest.raises(DataError, match="of another method"):
        read_wkt(
            wkt.replace(
                'METHOD["Vertical Offset and Slope",ID["EPSG",1046]]',
                'METHOD["Vertical Offset",ID["EPSG",9616]]',
            )
        )
    with pytest.raises(DataError, match=r"parameters are missing.*Vertical Offset"):
        read_wkt(
            wkt.replace('PARAMETER["Vertical Offset",', 'PARAMETER["Horizontal Offset",').replace(
                'ID["EPSG",8603]', 'ID["EPSG",8699]'
            )
        )


def test_places_out_of_range_are_refused():
    with pytest.raises(DataError, match="latitude"):
        EXAMPLE.shift(95.0, 8.0)
