"""Damaged copies of a good record: every one is refused with its line, or left out on request."""

from __future__ import annotations

import contextlib
import gzip
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from clockgeo.errors import ClockgeoError, DataError
from clockgeo.frequency import RecordLayout, read_record
from clockgeo.times import tai_from_iso

GOOD = ["# mjd\ty", *(f"{60_400 + i / 86_400:.10f}\t{(i % 7 - 3) * 1e-17:.3e}" for i in range(50))]


def read(folder, lines, *, name="record.txt", skip_bad_rows=False, latest_ns=None, **stated):
    content = lines if isinstance(lines, bytes) else ("\n".join(lines) + "\n").encode()
    (folder / name).write_bytes(content)
    about = {key: stated.pop(key) for key in ("nominal_ratio", "carrier") if key in stated}
    layout = RecordLayout(**{"file": name, "interval": 1.0, **stated})
    return read_record(
        layout, base=folder, name="lab", skip_bad_rows=skip_bad_rows, latest_ns=latest_ns, **about
    )


def damaged(line, text):
    """The good record with one line, counted from 1, replaced."""
    lines = list(GOOD)
    lines[line - 1] = text
    return lines


@pytest.mark.parametrize(
    ("text", "problem"),
    [
        ("x60400.0001\t1e-17", "the time is not a number: 'x60400.0001'"),
        ("60400.0001\tx", "the value is not a number: 'x'"),
        ("60400.0001", "the value is missing"),
        ("60400.0001\t", "the value is missing"),
        ("\t1e-17", "the time is missing"),
        ("nan\t1e-17", "the time is not finite"),
        ("inf\t1e-17", "the time is not finite"),
        ("60400.0001\tinf", "the value is not finite"),
        ("60400.0001\t-Infinity", "the value is not finite"),
        ("60400,0001\t1e-17", "the time is not a number: '60400,0001'"),
        ("60400.0001\t1,5e-17", "the value is not a number: '1,5e-17'"),
        ("60400.0001\t1e-17.5", "the value is not a number"),
        ("12.0\t1e-17", "the time lies outside the years 1972 to 2247"),
        ("999999.0\t1e-17", "the time lies outside the years 1972 to 2247"),
        ("1e300\t1e-17", "the time lies outside the years"),
        ("60400.0001\t0x10", "the value is not a number"),
        ("60400.0001\t1_0", "the value is not a number"),
    ],
)
@pytest.mark.parametrize("line", [2, 20, 51])
def test_a_row_that_cannot_be_used_is_named_by_its_line(tmp_path, text, problem, line):
    with pytest.raises(DataError, match=r"cannot be used") as caught:
        read(tmp_path, damaged(line, text))
    assert "1 of 50 rows" in str(caught.value)
    assert f"record.txt, line {line}: {problem.split(':')[0]}" in str(caught.value)
    assert problem in str(caught.value)
    assert "--skip-bad-rows" in str(caught.value)


def test_all_bad_rows_are_counted_and_the_first_named(tmp_path):
    lines = list(GOOD)
    for line in range(10, 20):
        lines[line - 1] = "60400.0\t?"
    with pytest.raises(DataError, match=r"10 of 50 rows cannot be used.*line 10.*line 14.*5 more"):
        read(tmp_path, lines)


def test_bad_rows_are_left_out_on_request_and_said_so(tmp_path):
    record = read(tmp_path, damaged(20, "60400.0001\t?"), skip_bad_rows=True)
    assert len(record) == 49
    assert any("1 of 50 rows cannot be used and were left out" in note for note in record.notes)


def test_lines_are_counted_through_comments_and_blank_lines(tmp_path):
    lines = [*GOOD[:5], "", "# pause", "", *GOOD[5:20], "60400.01\t?", *GOOD[20:]]
    with pytest.raises(DataError, match=r"line 24: the value is not a number"):
        read(tmp_path, lines)


@pytest.mark.parametrize("header", [[], ["mjd\ty"]])
def test_lines_are_counted_through_blank_lines_alone(tmp_path, header):
    lines = [*header, *GOOD[1:5], "", "", *GOOD[5:20], "60400.01\t?", *GOOD[20:], "", ""]
    with pytest.raises(DataError, match=f"line {22 + len(header)}: the value is not a number"):
        read(tmp_path, lines)


@pytest.mark.parametrize(
    ("value", "nominal"), [("ratio", Fraction(12, 10)), ("offset", Fraction(10**15))]
)
def test_bad_ratios_and_offsets_are_named_too(tmp_path, value, nominal):
    good = "1.2000000000000000001" if value == "ratio" else "0.01"
    lines = [f"{60_400 + i / 86_400:.10f} {good}" for i in range(10)]
    lines[3] = "60400.01 1.2.3"
    lines[6] = "60400.02 inf"
    with pytest.raises(DataError, match=r"2 of 10 rows.*line 4: the value is not a number.*line 7"):
        read(tmp_path, lines, value=value, nominal_ratio=nominal, carrier=nominal)


def test_a_row_where_a_flag_or_u_is_missing(tmp_path):
    lines = [f"{60_400 + i / 86_400:.10f},1e-17,1,1e-18" for i in range(10)]
    lines[2] = "60400.01,1e-17"
    lines[4] = "60400.02,1e-17,1,-1e-18"
    lines[5] = "60400.03,1e-17,1,x"
    with pytest.raises(DataError, match=r"3 of 10 rows") as caught:
        read(tmp_path, lines, flag_column=3, valid_flags=(1,), u_column=4)
    for told in (
        "line 3: the u is missing",
        "line 5: u is not a number >= 0",
        "line 6: the u is not",
    ):
        assert told in str(caught.value)


def test_contradicting_rows_are_an_error_naming_both_lines(tmp_path):
    lines = damaged(20, GOOD[20].split("\t")[0] + "\t9e-17")
    with pytest.raises(DataError, match=r"1 times have rows that contradict.*line 20.*line 21"):
        read(tmp_path, lines)
    record = read(tmp_path, lines, skip_bad_rows=True)
    assert len(record) == 48
    assert any("contradicting rows and were left out" in note for note in record.notes)


def test_contradictions_between_files_name_the_files(tmp_path):
    (tmp_path / "a.txt").write_text("60400.0 1e-17\n60401.0 2e-17\n")
    (tmp_path / "b.txt").write_text("60401.0 3e-17\n60402.0 2e-17\n")
    layout = RecordLayout(file=("a.txt", "b.txt"), interval=1.0)
    with pytest.raises(
        DataError, match=r"a\.txt, line 2 and b\.txt, line 1: values 2e-17 and 3e-17"
    ):
        read_record(layout, base=tmp_path, name="lab")


def test_a_missing_file_is_named(tmp_path):
    with pytest.raises(DataError, match=r"does not exist: absent\.txt \(at lab\)"):
        read_record(RecordLayout(file="absent.txt"), base=tmp_path, name="lab")


def test_a_folder_is_no_record(tmp_path):
    (tmp_path / "folder").mkdir()
    with pytest.raises(DataError, match=r"is a folder"):
        read_record(RecordLayout(file="folder"), base=tmp_path, name="lab")


def test_a_pattern_without_a_file_is_named(tmp_path):
    with pytest.raises(DataError, match=r"no file fits the pattern: day\*\.txt"):
        read_record(RecordLayout(file="day*.txt"), base=tmp_path, name="lab")


@pytest.mark.parametrize("content", [b"", b"\n\n  \n", b"# only\n# comments\n", b"mjd y\n"])
def test_a_file_without_rows_is_refused(tmp_path, content):
    with pytest.raises(DataError, match=r"the file is empty|the file holds no row"):
        read(tmp_path, content)


@pytest.mark.parametrize("content", [b"\x00\x01\x02" * 100, bytes(range(256)), b"60400\x00 1\n"])
def test_a_binary_file_is_refused(tmp_path, content):
    with pytest.raises(DataError, match=r"binary, not text"):
        read(tmp_path, content)


@pytest.mark.parametrize("kept", [0.1, 0.5, 0.98])
def test_a_truncated_gzip_is_refused(tmp_path, kept):
    packed = gzip.compress("\n".join(GOOD * 20).encode())
    with pytest.raises(DataError, match=r"gzip file is truncated or damaged"):
        read(tmp_path, packed[: int(kept * len(packed))], name="record.txt.gz")


def test_a_gzip_with_a_flipped_bit_is_refused(tmp_path):
    packed = bytearray(gzip.compress("\n".join(GOOD * 20).encode()))
    packed[len(packed) // 2] ^= 0xFF
    with pytest.raises(DataError, match=r"gzip file is truncated or damaged"):
        read(tmp_path, bytes(packed), name="record.txt.gz")


@pytest.mark.parametrize(
    ("stated", "problem"),
    [
        ({"value_column": 3}, "no such column: 3.*Columns 1 to 2"),
        ({"value_column": "z"}, "no column of this name: 'z'.*Names in the header: mjd, y"),
        ({"time_column": "mjdd"}, "Did you mean 'mjd'"),
    ],
)
def test_a_wrong_column_is_refused(tmp_path, stated, problem):
    with pytest.raises(DataError, match=problem):
        read(tmp_path, GOOD, **stated)


def test_one_column_for_two_things_is_refused(tmp_path):
    with pytest.raises(DataError, match=r"time and value are said to be in the same column: 1"):
        read(tmp_path, GOOD, value_column=1)


def test_another_column_as_values_is_questioned(tmp_path):
    lines = [f"{60_400 + i / 86_400:.10f} 1e-17 {i + 1}" for i in range(10)]
    with pytest.raises(DataError, match=r"far from what they should be.*Check value_column"):
        read(tmp_path, lines, value_column=3)


@pytest.mark.parametrize("nominal", ["1.2075070393433378", "0.83", "2.6"])
def test_a_ratio_against_the_wrong_nominal_is_questioned(tmp_path, nominal):
    lines = [f"{60_400 + i / 86_400:.10f} 1.207517039343337849" for i in range(10)]
    with pytest.raises(DataError, match=r"far from what they should be.*right pair.*right way up"):
        read(tmp_path, lines, value="ratio", nominal_ratio=Fraction(nominal))


def test_ratios_read_as_fractional_are_questioned(tmp_path):
    lines = [f"{60_400 + i / 86_400:.10f} 1.207507039343337849" for i in range(10)]
    with pytest.raises(DataError, match=r"whether it holds ratios"):
        read(tmp_path, lines)


def test_offsets_of_a_wrong_carrier_are_questioned(tmp_path):
    lines = [f"{60_400 + i / 86_400:.10f} 0.1" for i in range(10)]
    with pytest.raises(DataError, match=r"Check the carrier"):
        read(tmp_path, lines, value="offset", carrier=Fraction(9_192))


def test_a_stamp_in_the_future_is_refused_where_the_present_is_stated(tmp_path):
    lines = damaged(51, "70000.0\t1e-17")
    with pytest.raises(DataError, match=r"1 of 50 stamps lie in the future: 2050-07-13"):
        read(tmp_path, lines, latest_ns=tai_from_iso("2030-01-01T00:00:00Z"))


@pytest.mark.parametrize("flags", ["all nan", "all flagged"])
def test_a_record_without_a_usable_row_is_refused(tmp_path, flags):
    value, flag = ("nan", 1) if flags == "all nan" else ("1e-17", 0)
    lines = [f"{60_400 + i}.0 {value} {flag}" for i in range(3)]
    with pytest.raises(DataError, match=r"no row is usable.*flag_column"):
        read(tmp_path, lines, flag_column=3, valid_flags=(1,))


@given(
    line=st.integers(1, 51),
    text=st.text(alphabet=st.characters(codec="utf-8", exclude_characters="\n\r"), max_size=30),
)
@settings(max_examples=150, deadline=None)
def test_any_line_is_read_or_refused_but_never_breaks_the_reader(tmp_path_factory, line, text):
    folder = tmp_path_factory.getbasetemp()
    try:
        record = read(folder, damaged(line, text), name="fuzz.txt")
    except ClockgeoError:
        return
    assert np.all(np.isfinite(record.y[record.usable]))
    assert len(record) in {49, 50, 51}


@given(content=st.binary(max_size=300))
@settings(max_examples=150, deadline=None)
def test_any_bytes_are_read_or_refused(tmp_path_factory, content):
    folder = tmp_path_factory.getbasetemp()
    with contextlib.suppress(ClockgeoError):
        read(folder, content, name="bytes.txt")
