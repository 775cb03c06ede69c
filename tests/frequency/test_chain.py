"""Chains of comparators: printed digits, both directions, one line of time."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from checks import assert_published
from clockgeo.constants import SPEED_OF_LIGHT
from clockgeo.errors import DataError
from clockgeo.frequency.chain import Chain, Link, find_chains, reduced_ratio
from clockgeo.frequency.combination import combine
from clockgeo.frequency.comparator import comparator_from
from clockgeo.frequency.exchange import read_exchange, read_output, rows_state_u
from clockgeo.frequency.exchange_writing import write_exchange
from clockgeo.frequency.record import Record
from frequency.invented_chain import LASER, SR, YB, entry, printed_chain

OUTPUTS = (Fraction("3.217e-14"), Fraction("-2.9e-15"))
RATIO = Fraction("1.495991618544944037636529918853")


def test_the_printed_chain():
    chain = printed_chain(
        [
            entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
            entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
        ]
    )
    reduced = reduced_ratio(chain, OUTPUTS)
    assert reduced == Fraction("2.927e-14")
    ratio = chain.nominal_ratio * (1 + reduced)
    assert abs(ratio - RATIO) < Fraction(1, 10**27)
    # One float steps by 2.2e-16 here: rounding to it alone is off by 0.2 m of height, and a product
    # of floats by the 1.6 m that are told of such routes.
    floats = [float(one) for one in (SR, LASER, YB)]
    product = (floats[1] / floats[0]) * (floats[2] / floats[1])
    product *= 1.0 + sum(float(one) for one in OUTPUTS)
    off = [float((Fraction(one) - RATIO) / RATIO) for one in (float(ratio), product)]
    metres = [abs(shift) * SPEED_OF_LIGHT.value**2 / 9.80665 for shift in off]
    assert_published(metres[0], "0.2")
    assert_published(metres[1], "1.6")


@pytest.mark.parametrize("turned", [(False, False), (True, False), (False, True), (True, True)])
@pytest.mark.parametrize("scale", ["nominal", "1", "-1", "-2.5e14", "ratio"])
def test_either_direction_and_any_scale_give_the_same_ratio(turned, scale):
    """Outputs follow from true frequencies; the chain must find their ratio again."""
    true = {
        "WEST_SR": Fraction(SR),
        "FIBRE_L": Fraction(LASER) * (1 + Fraction("7.3e-14")),
        "EAST_YB": Fraction(YB) * (1 + Fraction("2.927e-14")),
    }
    nominal = {"WEST_SR": SR, "FIBRE_L": LASER, "EAST_YB": YB}
    entries, outputs = [], []
    for (a, b), turn in zip((("WEST_SR", "FIBRE_L"), ("FIBRE_L", "EAST_YB")), turned, strict=True):
        a, b = (b, a) if turn else (a, b)
        size = {"nominal": nominal[b], "ratio": nominal[a]}.get(scale, scale)
        entries.append(entry(b, a, nu_b=nominal[b], nu_a=nominal[a], scale=size))
        ratio = Fraction(nominal[b]) / Fraction(nominal[a])
        outputs.append((true[b] - ratio * true[a]) / Fraction(size))
    chain = printed_chain(entries)
    found = chain.nominal_ratio * (1 + reduced_ratio(chain, outputs))
    # Products of reduced ratios, 1e-27 here, are left out.
    assert abs(found / (true["EAST_YB"] / true["WEST_SR"]) - 1) < Fraction(1, 10**26)


def test_ratios_of_whole_numbers_are_exact():
    """A comb referred by integers: mB/mA instead of nominal frequencies."""
    one = comparator_from(
        {"name": "A_Y-A_X", "numrhoBA": "3", "denrhoBA": "7", "sB": "1e9", "nu0A": "7e9"}, where="t"
    )
    assert Chain((Link(one, 1),)).nominal_ratio == Fraction(3, 7)
    assert Chain((Link(one, -1),)).nominal_ratio == Fraction(7, 3)
    assert Chain((Link(one, 1),)).coefficients == (Fraction(1, 3),)
    assert Chain((Link(one, -1),)).coefficients == (Fraction(-1, 3),)


def test_contradicting_nominal_frequencies_are_refused():
    entries = [
        entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a="194400121000000.5"),
    ]
    with pytest.raises(
        DataError, match=r"two nominal frequencies of oscillator FIBRE_L.*000\.5 Hz"
    ):
        printed_chain(entries)


def test_no_way_from_one_to_the_other_is_told():
    entries = [entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR)]
    with pytest.raises(DataError, match="no comparator has such an oscillator: EAST_YB"):
        printed_chain(entries)


HEADER = """- name: {quote}MID_L-WEST_C{quote}
  numrhoBA: {quote}194400121000000.0{quote}
  denrhoBA: {quote}429228004229873.0{quote}
  sB: {quote}194400121000000.0{quote}
  nu0A: {quote}429228004229873.0{quote}
  nu0B: {quote}194400121000000.0{quote}
  grsA: 1e-17
  uA_sys: 3.0e-18
  interval: 1
  lag: {lag}
  remark: kept as it is
"""
START = 61_529  # MJD
DAY = 86_400


def written(folder, *, lag=1.0, quote="'", rows=None):
    """A folder with one comparator and a day of rows (second, value, flag)."""
    (folder / "MID_L-WEST_C").mkdir(parents=True)
    (folder / "net.yml").write_text(HEADER.format(lag=lag, quote=quote), encoding="utf-8")
    lines = ["# a comment"]
    for second, value, flag in rows:
        mjd = START + (second + lag) / DAY
        lines.append(f"{mjd:.6f} {value!r} {flag}")
    (folder / "MID_L-WEST_C" / "day.txt").write_text("\n".join(lines) + "\n", encoding="utf-8")
    return read_exchange(folder)


@pytest.mark.parametrize("lag", [0.0, 0.5, 1.0])
def test_a_day_of_stamps_loses_and_doubles_nothing(tmp_path, lag):
    """86 400 rows of 6 decimals, shuffled, some twice, an hour missing, flags 0, 1 and 2."""
    rng = np.random.default_rng(4)
    seconds = np.concatenate([np.arange(0, 40_000), np.arange(43_600, DAY)])
    flags = rng.choice([0, 1, 2], seconds.size, p=[0.05, 0.15, 0.8])
    rows = [(s, float(f"{s * 1e-18:.6e}"), f) for s, f in zip(seconds, flags, strict=True)]
    rows += [rows[k] for k in rng.choice(len(rows), 50, replace=False)]
    rng.shuffle(rows)
    folder = written(tmp_path / "net", lag=lag, rows=rows)
    output = read_output(folder, "MID_L-WEST_C")
    chain = find_chains(folder.comparators, denominator="WEST_C", numerator="MID_L")
    combined = combine(chain, {"MID_L-WEST_C": output}, name="day")
    record, expected = combined.record, seconds[flags == 2]
    assert combined.complete == (expected.size,) == (len(record),)
    from_midnight = record.tick - record.tick[0] + expected[0]
    np.testing.assert_array_equal(from_midnight, expected)
    np.testing.assert_allclose(record.y, expected * 1e-18, rtol=1e-6)
    # Stamps are rounded to 0.0864 s; the gates they stand for are found to better than 0.05 s.
    residual = (output.tai_ns[output.usable] - record.tai_ns) / 1e9
    assert np.max(np.abs(residual)) <= 0.05
    with_experimental = read_output(folder, "MID_L-WEST_C", experimental=True)
    assert np.count_nonzero(with_experimental.usable) == np.count_nonzero(flags > 0)


@pytest.mark.parametrize("quote", ["'", '"', ""])
def test_quoted_and_bare_headers_are_the_same(tmp_path, quote):
    one = written(tmp_path / "net", quote=quote, rows=[(0, 1e-15, 2)]).comparators["MID_L-WEST_C"]
    assert one.nominal_a == Fraction("429228004229873.0")
    assert (one.redshift_a, one.u_a) == (1e-17, 3e-18)
    assert one.texts["remark"] == "kept as it is"


def test_what_is_not_changed_is_written_byte_by_byte(tmp_path):
    folder = written(tmp_path / "net", rows=[(s, 1e-15 * s, 2) for s in range(50)])
    write_exchange(folder, tmp_path / "copy")
    for path in sorted((tmp_path / "net").rglob("*")):
        if path.is_file():
            other = tmp_path / "copy" / path.relative_to(tmp_path / "net")
            assert other.read_bytes() == path.read_bytes()


def test_new_outputs_leave_further_columns_alone(tmp_path):
    folder = written(tmp_path / "net", rows=[(s, 1e-15 * s, 2 if s % 3 else 1) for s in range(20)])
    data = tmp_path / "net" / "MID_L-WEST_C" / "day.txt"
    lines = data.read_text(encoding="utf-8").splitlines()
    lines[1:] = [f"{line}   3e-18  note-{row}" for row, line in enumerate(lines[1:])]
    data.write_text("\n".join(lines) + "\n", encoding="utf-8")
    assert rows_state_u(folder, "MID_L-WEST_C")
    old = read_output(folder, "MID_L-WEST_C", experimental=True)
    usable = old.usable.copy()
    usable[5] = False
    new = replace(old, y=old.y + 1e-16, usable=usable)
    write_exchange(folder, tmp_path / "new", outputs={"MID_L-WEST_C": new})
    again = (tmp_path / "new" / "MID_L-WEST_C" / "day.txt").read_text(encoding="utf-8")
    for row, (before, after) in enumerate(zip(lines, again.splitlines(), strict=True), start=-1):
        if row < 0:
            assert after == before
            continue
        one, other = before.split(), after.split()
        assert [other[0], *other[3:]] == [one[0], *one[3:]]
        assert float(other[1]) == pytest.approx(float(one[1]) + 1e-16, rel=1e-12)
        assert other[2] == ("0" if row == 5 else one[2])


def test_a_leap_second_neither_loses_nor_doubles_a_tick(tmp_path):
    """2016-12-31 had 86 401 s; its MJD runs on 86 400 s, so that the last one has no stamp."""
    folder = tmp_path / "net"
    (folder / "MID_L-WEST_C").mkdir(parents=True)
    (folder / "net.yml").write_text(HEADER.format(lag=0, quote=""), encoding="utf-8")
    seconds = [*range(86_300, 86_400), *range(86_400, 86_500)]
    lines = [f"{57_753 + second / DAY:.6f} {second * 1e-18!r} 2" for second in seconds]
    (folder / "MID_L-WEST_C" / "day.txt").write_text("\n".join(lines) + "\n", encoding="utf-8")
    output = read_output(read_exchange(folder), "MID_L-WEST_C")
    steps = np.diff(output.tick)
    assert len(output) == 200
    # The gate of the leap second is a gap of one; all others follow one another.
    assert np.flatnonzero(steps != 1).tolist() == [99]
    assert steps[99] == 2
    elapsed = (output.tai_ns - output.tai_ns[0]) / 1e9
    np.testing.assert_allclose(elapsed, output.tick - output.tick[0], atol=0.09)


def test_new_outputs_are_read_back(tmp_path):
    folder = written(tmp_path / "net", rows=[(s, 1e-15 * s, 2 if s % 3 else 0) for s in range(50)])
    output = read_output(folder, "MID_L-WEST_C")
    write_exchange(folder, tmp_path / "new", outputs={"MID_L-WEST_C": output})
    again = read_output(read_exchange(tmp_path / "new"), "MID_L-WEST_C")
    np.testing.assert_array_equal(again.usable, output.usable)
    np.testing.assert_allclose(again.y[again.usable], output.y[output.usable], rtol=1e-12)
    assert np.max(np.abs(again.tai_ns - output.tai_ns)) < 5e7


@given(st.lists(st.integers(0, 200), min_size=1, max_size=60, unique=True), st.data())
def test_a_chain_is_valid_where_all_its_comparators_are(seconds, data):
    others = data.draw(st.lists(st.sampled_from(seconds), min_size=1, unique=True))
    entries = [
        entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
    ]
    chain = printed_chain(entries)

    def output(places, value):
        tick = np.array(sorted(places))
        return Record(
            "r", tick * 10**9, np.full(tick.size, value), np.ones(tick.size, bool), 1.0, tick
        )

    outputs = {"FIBRE_L-WEST_SR": output(seconds, 2e-15), "EAST_YB-FIBRE_L": output(others, 3e-15)}
    record = combine([chain], outputs, name="both").record
    np.testing.assert_array_equal(record.tick, sorted(others))
    np.testing.assert_allclose(record.y, 5e-15, rtol=1e-12)


@pytest.mark.parametrize(
    ("damage", "told"),
    [
        (lambda t: t.replace("numrhoBA", "numrho"), "a comparator lacks keys: numrhoBA"),
        (lambda t: t.replace("429228004229873.0", "many"), "is not a number"),
        (lambda t: t.replace("MID_L-WEST_C", "MID_L"), "name is not two oscillators"),
        (lambda t: t[:0] + "just text", "not a list of comparators"),
        (lambda t: t + "  - [", "the header is not YAML"),
        (lambda t: t + t, "stands in the headers twice"),
        (lambda t: t + "  weighting: sigma\n", "unknown weighting: sigma"),
    ],
)
def test_damaged_headers_are_refused(tmp_path, damage, told):
    written(tmp_path / "net", rows=[(0, 1e-15, 2)])
    path = tmp_path / "net" / "net.yml"
    path.write_text(damage(path.read_text(encoding="utf-8")), encoding="utf-8")
    with pytest.raises(DataError, match=told):
        read_exchange(tmp_path / "net")


def test_missing_folders_and_data_are_told(tmp_path):
    with pytest.raises(DataError, match="no header of the exchange format"):
        read_exchange(tmp_path)
    folder = written(tmp_path / "net", rows=[(0, 1e-15, 2)])
    (tmp_path / "net" / "MID_L-WEST_C" / "day.txt").unlink()
    with pytest.raises(DataError, match="a comparator has no data: MID_L-WEST_C"):
        read_output(folder, "MID_L-WEST_C")
    with pytest.raises(DataError, match="there is no such comparator: X"):
        read_output(folder, "X")
