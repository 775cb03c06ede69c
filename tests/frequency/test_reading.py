"""Reading good records: every spelling of times, values, separators and files."""

from __future__ import annotations

import gzip
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from clockgeo.errors import DataError
from clockgeo.files import sha256_of
from clockgeo.frequency import RecordLayout, read_record
from clockgeo.times import SECOND_NS, iso_utc, tai_from_iso

ROWS = [("60400.000000", "1e-17"), ("60400.000012", "-2e-17"), ("60400.000023", "3.5e-17")]
Y = [1e-17, -2e-17, 3.5e-17]


def read(folder, content, name="record.txt", **stated):
    """Write `content` into a file and read it as a record."""
    data = content if isinstance(content, bytes) else content.encode()
    (folder / name).write_bytes(data)
    about = {
        key: stated.pop(key)
        for key in ("nominal_ratio", "carrier", "skip_bad_rows", "latest_ns")
        if key in stated
    }
    layout = RecordLayout(**{"file": name, "interval": 1.0, **stated})
    return read_record(layout, base=folder, name="lab", **about)


def text(separator="\t", rows=ROWS, end="\n"):
    return "".join(separator.join(row) + end for row in rows)


@pytest.mark.parametrize("separator", ["\t", " ", "   ", ",", ", ", ";", " ; ", " \t "])
@pytest.mark.parametrize("end", ["\n", "\r\n", "  \n"])
def test_separators_and_line_ends(tmp_path, separator, end):
    record = read(tmp_path, text(separator, end=end))
    np.testing.assert_array_equal(record.y, Y)
    # 60400 is 2024-03-31 (51544 is 2000-01-01); 0.000012 d is 1.0368 s.
    assert iso_utc(record.start) == "2024-03-31T00:00:00.000Z"
    np.testing.assert_array_equal(np.diff(record.tai_ns), [1_036_800_000, 950_400_000])
    np.testing.assert_array_equal(np.diff(record.tick), [1, 1])


@pytest.mark.parametrize(
    "content",
    [
        "# a comment\n# another\n" + text(),
        "\n\n" + text() + "\n\n",
        "mjd\ty\n" + text(),
        "# mjd, y\n" + text(),
        "\ufeff" + text(),
        text(end="  # noted by hand\n"),
        text().replace("\n", "\n\n# in between\n"),
        text().rstrip("\n"),
        "MJD y\n" + text(" "),
        '"mjd","y"\n' + text(","),
    ],
    ids=[
        "comments",
        "blank lines",
        "header",
        "header in a comment",
        "byte order mark",
        "comments in rows",
        "comments between",
        "no last line end",
        "words",
        "quoted header",
    ],
)
def test_comments_headers_and_blank_lines(tmp_path, content):
    np.testing.assert_array_equal(read(tmp_path, content).y, Y)


@pytest.mark.parametrize("header", ["# time; deviation; flag\n", "time;deviation;flag\n"])
def test_columns_by_name_with_a_flag(tmp_path, header):
    rows = "".join(f"{t};{y};{flag}\n" for (t, y), flag in zip(ROWS, "210", strict=True))
    stated = {"time_column": "time", "value_column": "deviation", "flag_column": "flag"}
    record = read(tmp_path, header + rows, valid_flags=(1, 2), **stated)
    assert record.usable.tolist() == [True, True, False]
    only_two = read(tmp_path, header + rows, valid_flags=("2",), **stated)
    assert only_two.usable.tolist() == [True, False, False]
    # The row is kept, although its flag says that it is not to be used.
    np.testing.assert_array_equal(only_two.y, Y)


def test_flags_are_compared_as_numbers_too(tmp_path):
    rows = "".join(f"{t} {y} {f}\n" for (t, y), f in zip(ROWS, ["1.0", "0.0", "x"], strict=True))
    record = read(tmp_path, rows, flag_column=3, valid_flags=(1,))
    assert record.usable.tolist() == [True, False, False]


def test_columns_by_number_and_a_u_per_row(tmp_path):
    rows = "".join(f"lab {u} {y} {t}\n" for (t, y), u in zip(ROWS, ["1e-18"] * 3, strict=True))
    record = read(tmp_path, rows, time_column=4, value_column=3, u_column=2)
    np.testing.assert_array_equal(record.y, Y)
    np.testing.assert_array_equal(record.u, [1e-18] * 3)


@pytest.mark.parametrize("word", ["nan", "NaN", "NAN", "-nan"])
@pytest.mark.parametrize("value", ["fractional", "ratio", "offset"])
def test_nan_is_a_row_without_a_value(tmp_path, word, value):
    rows = [("60400.0", "1.0"), ("60400.00001157407407", word), ("60400.00002314814815", "1.0")]
    record = read(
        tmp_path,
        text(rows=rows).replace("1.0\n", "1.0\n" if value == "ratio" else "1e-16\n"),
        value=value,
        nominal_ratio=Fraction(1),
        carrier=Fraction(10**14),
    )
    assert record.usable.tolist() == [True, False, True]
    assert np.isnan(record.y[1])
    assert record.valid_seconds == 2.0
    assert record.uptime == 2 / 3


@pytest.mark.parametrize(
    ("stamp", "same"),
    [
        ("2024-04-01T00:00:00.5Z", "2024-04-01T00:00:00.500Z"),
        ("2024-04-01T00:00:00.5", "2024-04-01T00:00:00.500Z"),
        ("2024-04-01T02:00:00.5+02:00", "2024-04-01T00:00:00.500Z"),
        ("2024-04-01T00:00", "2024-04-01T00:00:00.000Z"),
        ("2016-12-31T23:59:60.5Z", "2016-12-31T23:59:60.500Z"),
    ],
)
def test_iso_8601_times(tmp_path, stamp, same):
    record = read(tmp_path, f"{stamp}\t1e-17\n", time="iso8601")
    assert iso_utc(record.start) == same


def test_iso_8601_with_a_blank_between_date_and_time(tmp_path):
    record = read(
        tmp_path, "2024-04-01 00:00:00\t1e-17\n2024-04-01 00:00:01\t2e-17\n", time="iso8601"
    )
    np.testing.assert_array_equal(np.diff(record.tai_ns), [SECOND_NS])


def test_seconds_count_through_a_leap_second(tmp_path):
    stamps = ["23:59:59", "23:59:60"]
    rows = "".join(f"2016-12-31T{s}Z 1e-17\n" for s in stamps) + "2017-01-01T00:00:00Z 1e-17\n"
    record = read(tmp_path, rows, time="iso8601", interval=None)
    assert record.interval == 1.0
    np.testing.assert_array_equal(np.diff(record.tick), [1, 1])


@given(
    day=st.integers(41_317, 142_000),
    nanosecond=st.integers(0, 86_399_999_999_999),
    digits=st.integers(14, 20),
)
@settings(max_examples=60, deadline=None)
def test_an_mjd_with_14_decimals_or_more_gives_every_nanosecond_back(
    tmp_path_factory, day, nanosecond, digits
):
    part = round(Fraction(nanosecond * 10**digits, 86_400 * 10**9))
    if part == 10**digits:
        return
    folder = tmp_path_factory.getbasetemp()
    record = read(folder, f"{day}.{part:0{digits}d} 1e-17\n", name="instant.txt")
    # Independent route: ISO 8601 of the day and the seconds in it, counted as whole numbers.
    import datetime as dt

    date = dt.date.fromordinal(day + 678_576)
    second, rest = divmod(nanosecond, 10**9)
    hour, second = divmod(second, 3_600)
    minute, second = divmod(second, 60)
    same = tai_from_iso(f"{date}T{hour:02d}:{minute:02d}:{second:02d}.{rest:09d}Z")
    assert record.start == same


def test_an_mjd_never_passes_through_one_float(tmp_path):
    # One step of a float64 near 60 400 is 7.3e-12 d, 0.63 µs.
    record = read(tmp_path, "60400.50000000000001 1e-17\n60400.50001157407410 1e-17\n")
    assert record.tai_ns[0] % SECOND_NS == 1
    assert record.tai_ns[1] - record.tai_ns[0] == SECOND_NS + 1


@pytest.mark.parametrize(
    "spelled", ["1.000000000000000001000e0", "1000000000000000001000e-21", "+1.000000000000000001"]
)
def test_odd_spellings_of_ratios_are_exact(tmp_path, spelled):
    record = read(tmp_path, f"60400.0 {spelled}\n", value="ratio", nominal_ratio=Fraction(1))
    assert record.y[0] == 1e-18


@given(steps=st.lists(st.integers(-(10**9), 10**9), min_size=1, max_size=20))
@settings(max_examples=40, deadline=None)
def test_ratios_from_files_are_exact_to_1e_21(tmp_path_factory, steps):
    nominal = Fraction(51829583659086363, 42922800422987299)
    whole = 1_207_507_039_343_337_850_000_000
    texts = [f"1.{str(whole + step)[1:]}" for step in steps]
    rows = "".join(f"{60_400 + i}.0\t{ratio}\n" for i, ratio in enumerate(texts))
    folder = tmp_path_factory.getbasetemp()
    record = read(folder, rows, name="ratios.txt", value="ratio", nominal_ratio=nominal)
    for y, ratio in zip(record.y.tolist(), texts, strict=True):
        assert abs(Fraction(y) - (Fraction(ratio) - nominal) / nominal) < Fraction(1, 10**21)


def test_offsets_are_parts_of_the_carrier(tmp_path):
    record = read(tmp_path, "60400.0 0.429228004\n", value="offset", carrier=Fraction(429228004))
    assert record.y[0] == pytest.approx(1e-9, rel=3e-16)


def test_full_frequencies_are_ratios_to_their_nominal(tmp_path):
    record = read(
        tmp_path,
        "60400.0 429228004229873.419228004\n",
        value="ratio",
        nominal_ratio=Fraction("429228004229872.99"),
    )
    assert record.y[0] == pytest.approx(1e-15, rel=1e-6)


def test_gzip_is_recognised_by_its_bytes(tmp_path):
    packed = gzip.compress(text().encode())
    for name in ("a.txt.gz", "b.dat"):
        record = read(tmp_path, packed, name=name)
        np.testing.assert_array_equal(record.y, Y)
        assert record.sources[0].sha256 == sha256_of(tmp_path / name)


@pytest.mark.parametrize(
    "files", [("b.txt", "a.txt"), ("a.txt", "b.txt"), "*.txt", ("*.txt", "a.txt")]
)
def test_files_are_joined_in_time_order_whatever_their_order(tmp_path, files):
    (tmp_path / "b.txt").write_text(text(rows=ROWS[:2]))
    (tmp_path / "a.txt").write_text(text(rows=ROWS[2:]))
    record = read_record(RecordLayout(file=files, interval=1.0), base=tmp_path, name="lab")
    np.testing.assert_array_equal(record.y, Y)
    assert record.notes == ()
    assert {source.path for source in record.sources} == {"a.txt", "b.txt"}


def test_rows_out_of_order_are_sorted_with_a_note(tmp_path):
    record = read(tmp_path, text(rows=[ROWS[1], ROWS[0], ROWS[2]]))
    np.testing.assert_array_equal(record.y, Y)
    assert any("out of order in 1 places" in note for note in record.notes)


def test_repeated_rows_that_agree_are_merged_with_a_note(tmp_path):
    rows = [ROWS[0], ROWS[0], ROWS[1], ("60400.000023", "nan"), ("60400.000023", "nan")]
    record = read(tmp_path, text(rows=rows))
    assert len(record) == 3
    assert any("2 rows repeat" in note for note in record.notes)


def test_files_that_overlap_are_merged(tmp_path):
    (tmp_path / "a.txt").write_text(text(rows=ROWS[:2]))
    (tmp_path / "b.txt").write_text(text(rows=ROWS[1:]))
    layout = RecordLayout(file=("a.txt", "b.txt"), interval=1.0)
    record = read_record(layout, base=tmp_path, name="lab")
    np.testing.assert_array_equal(record.y, Y)


@pytest.mark.parametrize(("stamp", "shift"), [("start", 0), ("middle", 5), ("end", 10)])
def test_stamps_move_to_the_start_of_their_interval(tmp_path, stamp, shift):
    record = read(tmp_path, "60400.0 1e-17\n60401.0 1e-17\n", stamp=stamp, interval=10.0)
    assert tai_from_iso("2024-03-31T00:00:00Z") - record.start == shift * SECOND_NS
    assert record.span == 86_410.0


def test_weighting_is_kept(tmp_path):
    assert read(tmp_path, text(), weighting="lambda").weighting == "lambda"


def test_a_record_cannot_be_changed(tmp_path):
    record = read(tmp_path, text())
    with pytest.raises(ValueError, match="read-only"):
        record.y[0] = 0.0


def test_the_grid_is_filled_with_gaps(tmp_path):
    rows = [
        ("60400.0", "1e-17"),
        ("60400.00002314814815", "2e-17"),
        ("60400.00003472222222", "nan"),
        ("60400.00004629629630", "3e-17"),
    ]
    y, valid = read(tmp_path, text(rows=rows)).on_grid()
    np.testing.assert_array_equal(y, [1e-17, np.nan, 2e-17, np.nan, 3e-17])
    assert valid.tolist() == [True, False, True, False, True]


def test_a_layout_wants_flags_and_their_meaning_together():
    with pytest.raises(ValueError, match="flag_column and valid_flags belong together"):
        RecordLayout(file="a.txt", flag_column=3)
    with pytest.raises(ValueError, match="no file is named"):
        RecordLayout(file=())


def test_full_ratios_need_a_nominal_and_offsets_a_carrier(tmp_path):
    with pytest.raises(DataError, match="need the nominal ratio"):
        read(tmp_path, text(), value="ratio")
    with pytest.raises(DataError, match="need the optical frequency"):
        read(tmp_path, text(), value="offset")
