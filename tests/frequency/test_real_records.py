"""Four real days, kept beside the project: sampling, gaps, screening, what the rows give away."""

from __future__ import annotations

import gzip
from decimal import Decimal

import numpy as np
import pytest

from checks import assert_close
from clockgeo.frequency import RecordLayout, diagnose, read_record, screen
from clockgeo.times import tai_from_mjd_utc

# Rows, valid share and span in hours as the description beside the files prints them.
DAYS = {
    "pair1-day1": (25_142, 0.66, 7.4),
    "pair1-day2": (22_978, 0.43, 6.8),
    "pair1-day3": (21_159, 0.74, 6.2),
    "pair2-day3": (21_159, 0.76, 6.2),
}


def read(folder, name):
    return read_record(RecordLayout(file=f"{name}.txt.gz"), base=folder, name=name)


@pytest.mark.parametrize("name", DAYS)
def test_rows_valid_share_and_span(real_records, name):
    rows, share, hours = DAYS[name]
    record = read(real_records, name)
    assert len(record) == rows
    assert_close(record.usable.mean(), share, tolerance=0.005)
    # The second day, 6.748 h from its first to its last stamp, is printed as 6.8.
    assert_close(record.span / 3_600.0, hours, tolerance=0.06)


@pytest.mark.parametrize("name", DAYS)
def test_stamps_and_values_are_exact(real_records, name):
    # Independent route: the decimal module, row by row.
    record = read(real_records, name)
    with gzip.open(real_records / f"{name}.txt.gz", "rt") as stream:
        fields = [line.split() for line in stream]
    microdays = np.array([int(Decimal(stamp) * 10**6) for stamp, _ in fields])
    expected = tai_from_mjd_utc(microdays // 10**6, microdays % 10**6 * 86_400_000)
    np.testing.assert_array_equal(record.tai_ns, expected)
    np.testing.assert_array_equal(record.y, [float(value) for _, value in fields])


@pytest.mark.parametrize("name", DAYS)
def test_no_tick_is_lost_or_doubled(real_records, name):
    record = read(real_records, name)
    steps, ticks = np.diff(record.tai_ns) / 1e9, np.diff(record.tick)
    # Rows come every 12 or 13 microdays: 1.037 or 1.123 s by their stamps, 1.0568 s on average.
    plain = steps < 1.15
    assert plain.mean() > 0.999
    assert_close(np.mean(steps[plain]), 1.0568, tolerance=0.0002)
    assert_close(record.interval, 1.0568, tolerance=0.0002)
    assert np.all(ticks[plain] == 1)
    # Jumps are a whole number of intervals to half of one, and a rounding of the two stamps.
    assert np.all(np.abs(steps / record.interval - ticks) < 0.5 + 0.09)


def test_days_join_in_any_order(real_records):
    names = [f"pair1-day{day}.txt.gz" for day in (3, 1, 2)]
    layout = RecordLayout(file=tuple(names), interval=1.0568)
    joined = read_record(layout, base=real_records, name="pair1")
    pattern = RecordLayout(file="pair1-day*.txt.gz", interval=1.0568)
    same = read_record(pattern, base=real_records, name="pair1")
    assert len(joined) == 25_142 + 22_978 + 21_159
    np.testing.assert_array_equal(joined.tick, same.tick)
    np.testing.assert_array_equal(joined.y, same.y)


def test_an_interval_by_the_median_step_is_questioned(real_records):
    layout = RecordLayout(file="pair1-day1.txt.gz", interval=1.0368)
    record = read_record(layout, base=real_records, name="pair1")
    assert any("every 1.0568" in note and "as stated" in note for note in record.notes)
    assert np.all(np.diff(record.tick)[np.diff(record.tai_ns) < 1.15e9] == 1)


def test_two_pairs_of_one_day_share_the_time_line(real_records):
    first, second = read(real_records, "pair1-day3"), read(real_records, "pair2-day3")
    np.testing.assert_array_equal(first.tick, second.tick)


@pytest.mark.parametrize("name", DAYS)
def test_screening_leaves_servo_noise_alone(real_records, name):
    result = screen(read(real_records, name))
    assert result.counts["outlier"] <= 2
    # What is left out moves the mean by far less than the published statistical u, 1e-18.
    assert abs(result.mean_with - result.mean_without) < 1e-19


@pytest.mark.parametrize("name", DAYS)
def test_correlated_neighbours_are_pointed_out(real_records, name):
    found = {finding.kind: finding for finding in diagnose(read(real_records, name))}
    assert "interpolated" not in found
    if name.startswith("pair1"):
        # The published u is 1/0.56 = 1.8 times s/√N there.
        assert 1.5 < found["correlated"].factor < 2.3
        assert 15.0 < found["oscillation"].period < 30.0
