"""Harmonic loading: arguments against the sky, signs, tables that come back, damaged tables."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_close
from clockgeo.errors import DataError
from clockgeo.gravity import (
    Constituent,
    LoadTable,
    doodson_argument,
    read_load_table,
    sky_positions,
    uplift_difference,
    write_load_table,
)
from clockgeo.times import DAY_NS, SECOND_NS, tai_from_iso

EPOCH = tai_from_iso("2027-03-01T00:00:00Z")
GOOD = """# invented loading of one place
constituent,doodson,offset_deg,height_amplitude_m,height_phase_deg,potential_amplitude_m2_s2,potential_phase_deg,u_height_m
M2,255.555,0,0.0051,-35.2,0.021,12.0,0.0005
K1,165.555,90,0.0020,80.0,0.008,-70.0,0.0002
"""


def wave(**changes):
    values = {
        "constituent": "M2",
        "doodson": "255.555",
        "height_amplitude_m": 0.0,
        "height_phase_deg": 0.0,
        "potential_amplitude_m2_s2": 0.0,
        "potential_phase_deg": 0.0,
    }
    return Constituent(**{**values, **changes})


# Periods of the waves (hours or days): common knowledge of tides.
@pytest.mark.parametrize(
    ("doodson", "hours"),
    [
        ("255.555", 12.4206),
        ("273.555", 12.0000),
        ("245.655", 12.6583),
        ("165.555", 23.9345),
        ("145.555", 25.8193),
        ("163.555", 24.0659),
        ("075.555", 13.6608 * 24),
        ("065.455", 27.5546 * 24),
        ("055.565", 6798.4 * 24),
    ],
)
def test_periods_of_the_waves(doodson, hours):
    span = 400 * DAY_NS
    epochs = EPOCH + np.linspace(0, span, 40_001).astype(int)
    first, last = np.unwrap(doodson_argument(epochs, doodson))[[0, -1]]
    period = 2 * np.pi / (last - first) * span / SECOND_NS / 3600
    # five printed digits; secular terms of the arguments are smaller
    assert period == pytest.approx(hours, rel=1e-4)


def test_argument_of_tau_is_the_hour_angle_of_the_mean_moon():
    """Second route: the Moon of the ephemeris stands within its inequalities (8°) of the mean."""
    tai = EPOCH + np.arange(0, 60) * DAY_NS // 2
    x, y, _ = sky_positions(tai).moon.T
    hour_angle = -np.arctan2(y, x)
    tau = doodson_argument(tai, "155.555") - np.pi
    difference = np.degrees(np.angle(np.exp(1j * (tau - hour_angle))))
    assert np.max(np.abs(difference)) < 9.5
    assert abs(np.mean(difference)) < 2.0


def test_a_clock_feels_masses_and_uplift_with_opposite_sign():
    masses = LoadTable(constituents=(wave(potential_amplitude_m2_s2=0.02),))
    uplift = LoadTable(constituents=(wave(height_amplitude_m=0.002),), gravity=9.81)
    argument = doodson_argument([EPOCH], "255.555")
    assert masses.potential([EPOCH])[0] == pytest.approx(0.02 * np.cos(argument[0]))
    assert uplift.potential([EPOCH])[0] == pytest.approx(-9.81 * 0.002 * np.cos(argument[0]))


def test_phases_are_lags():
    """A lag of 90° brings the crest a quarter period later."""
    table = LoadTable(constituents=(wave(potential_amplitude_m2_s2=1.0, potential_phase_deg=90.0),))
    late = LoadTable(constituents=(wave(potential_amplitude_m2_s2=1.0),))
    quarter = round(12.4206012 / 4 * 3600 * SECOND_NS)
    assert table.potential([EPOCH + quarter])[0] == pytest.approx(
        late.potential([EPOCH])[0], abs=1e-3
    )


def test_u_sums_waves_as_independent():
    table = LoadTable(
        constituents=(wave(u_potential_m2_s2=0.003), wave(constituent="S2", u_height_m=0.0004)),
        gravity=9.8,
    )
    assert table.u == pytest.approx(np.hypot(0.003, 9.8 * 0.0004))


@pytest.mark.parametrize("name", ["load.csv", "load.nc"])
def test_tables_come_back(tmp_path, name):
    source = tmp_path / "source.csv"
    source.write_text(GOOD, encoding="utf-8")
    table = read_load_table(source, gravity=9.81)
    assert table.constituents[1].offset_deg == 90.0
    write_load_table(table, tmp_path / name)
    assert read_load_table(tmp_path / name, gravity=9.81) == table


@given(st.floats(0, 1), st.floats(-360, 360), st.floats(0, 1), st.floats(-360, 360))
def test_any_wave_comes_back_from_csv(tmp_path_factory, height, lag, potential, other_lag):
    table = LoadTable(
        constituents=(
            wave(
                height_amplitude_m=height,
                height_phase_deg=lag,
                potential_amplitude_m2_s2=potential,
                potential_phase_deg=other_lag,
            ),
        )
    )
    path = tmp_path_factory.mktemp("load") / "load.csv"
    write_load_table(table, path)
    assert read_load_table(path) == table


@pytest.mark.parametrize(
    ("damage", "message"),
    [
        (lambda _: "", "the table is empty"),
        (lambda t: t.replace("doodson", "doodsen"), "missing column: doodson"),
        (lambda t: t.replace("255.555", "255,555"), "line 3: 9 fields instead of 8"),
        (lambda t: t.replace("255.555", "2555.55"), r"line 3: constituent M2: doodson is wrong"),
        (lambda t: t.replace("0.0051", "-0.0051"), "height_amplitude_m is wrong: -0.0051"),
        (lambda t: t.replace("0.0051", "5,1"), "line 3"),
        (lambda t: t.replace("K1", "M2"), "constituents given twice: M2"),
        (lambda t: t.replace("80.0", "inf"), r"line 4: height_phase_deg is not a finite number"),
    ],
)
def test_damaged_tables_are_refused(tmp_path, damage, message):
    path = tmp_path / "load.csv"
    path.write_text(damage(GOOD), encoding="utf-8")
    with pytest.raises(DataError, match=message) as caught:
        read_load_table(path)
    assert "load.csv" in str(caught.value)


def test_damaged_netcdf_is_refused(tmp_path):
    import xarray

    good, bad = tmp_path / "good.nc", tmp_path / "bad.nc"
    write_load_table(LoadTable(constituents=(wave(),)), good)
    bad.write_bytes(good.read_bytes()[: good.stat().st_size // 16])
    with pytest.raises(DataError, match=r"not a netCDF file.*bad\.nc"):
        read_load_table(bad)
    with xarray.open_dataset(good) as dataset:
        dataset.load().drop_vars("doodson").to_netcdf(bad)
    with pytest.raises(DataError, match=r"missing variables: doodson.*bad\.nc"):
        read_load_table(bad)
    with xarray.open_dataset(good) as dataset:
        dataset.load().assign(doodson=("twice", ["255.555", "255.555"])).to_netcdf(bad)
    with pytest.raises(DataError, match="must share one dimension"):
        read_load_table(bad)
    with pytest.raises(FileNotFoundError, match="absent"):
        read_load_table(tmp_path / "absent.nc")


def test_uplift():
    # common knowledge of the field: 1 mm a-1 is 1.09e-19 a-1
    difference = uplift_difference(0.001, 1.0, gravity=9.81)
    assert_close(difference / 299_792_458.0**2, 1.09e-19, tolerance=0.005e-19)
    with pytest.raises(DataError, match=r"gravity out of range: 981\.0"):
        uplift_difference(0.001, 1.0, gravity=981.0)
