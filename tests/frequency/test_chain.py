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
from clockgeo.frequency.combination import combine, loops_of
from clockgeo.frequency.comparator import comparator_from, refuse_contradictions
from clockgeo.frequency.exchange import read_exchange, read_output, rows_state_u
from clockgeo.frequency.exchange_writing import write_exchange
from clockgeo.frequency.record import Record

# Nominal frequencies of an optical clock, a transfer laser and another clock, Hz; outputs scaled by
# the nominal frequency of the compared oscillator. Exact by rational arithmetic.
SR, LASER, YB = "429228004229873.0", "194400121000000.0", "642121496772645.0"
OUTPUTS = (Fraction("3.217e-14"), Fraction("-2.9e-15"))
RATIO = Fraction("1.495991618544944037636529918853")


def entry(b, a, *, nu_b, nu_a, scale=None, num=None, den=None):
    return {
        "name": f"{b}-{a}",
        "numrhoBA": num or nu_b,
        "denrhoBA": den or nu_a,
        "sB": scale or nu_b,
        "nu0A": nu_a,
        "nu0B": nu_b,
    }


def printed_chain(entries):
    comparators = [comparator_from(one, where="test") for one in entries]
    refuse_contradictions(comparators)
    return find_chains(
        {one.name: one for one in comparators}, denominator="WEST_SR", numerator="EAST_YB"
    )[0]


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


def constant(name, places, value):
    tick = np.array(places)
    y = np.broadcast_to(np.asarray(value, dtype=float), tick.shape).copy()
    return Record(name, tick * 10**9, y, np.ones(tick.size, bool), 1.0, tick)


def triangle():
    """A direct way, and one over a transfer laser."""
    entries = [
        entry("EAST_YB", "WEST_SR", nu_b=YB, nu_a=SR),
        entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
    ]
    comparators = {one["name"]: comparator_from(one, where="test") for one in entries}
    return find_chains(comparators, denominator="WEST_SR", numerator="EAST_YB")


def test_several_paths_are_one_estimate():
    """Alone each path is its sum; together the direct way has weight 2/3: variances 1 and 1 + 1."""
    chains = triangle()
    assert [len(chain.links) for chain in chains] == [1, 2]
    outputs = {
        "EAST_YB-WEST_SR": constant("a", range(10), 1e-15),
        "FIBRE_L-WEST_SR": constant("b", range(5, 20), 2e-15),
        "EAST_YB-FIBRE_L": constant("c", range(5, 15), 3e-15),
    }
    combined = combine(chains, outputs, name="both")
    assert (combined.complete, combined.several) == ((10, 10), 5)
    record = combined.record
    np.testing.assert_array_equal(record.tick, np.arange(15))
    np.testing.assert_allclose(record.y[:5], 1e-15, rtol=1e-12)
    np.testing.assert_allclose(record.y[5:10], (2 * 1e-15 + 5e-15) / 3, rtol=1e-12)
    np.testing.assert_allclose(record.y[10:], 5e-15, rtol=1e-12)
    noise = {"EAST_YB-WEST_SR": 2.0, "FIBRE_L-WEST_SR": 3.0}
    weighted = combine(chains, outputs, name="both", noise=noise).record
    direct = (1 / 4) / (1 / 4 + 1 / 10)
    np.testing.assert_allclose(weighted.y[5:10], direct * 1e-15 + (1 - direct) * 5e-15, rtol=1e-12)


def test_what_paths_share_counts_once():
    """Two parallel fibres behind one comb: the shared comparator keeps its full weight."""
    entries = [
        entry("WEST_L", "WEST_SR", nu_b=LASER, nu_a=SR),
        entry("EAST_L", "WEST_L", nu_b=LASER, nu_a=LASER),
        entry("MID_L", "WEST_L", nu_b=LASER, nu_a=LASER),
        entry("EAST_L", "MID_L", nu_b=LASER, nu_a=LASER),
        entry("EAST_YB", "EAST_L", nu_b=YB, nu_a=LASER),
    ]
    comparators = {one["name"]: comparator_from(one, where="test") for one in entries}
    chains = find_chains(comparators, denominator="WEST_SR", numerator="EAST_YB")
    rng = np.random.default_rng(8)
    values = {name: 1e-15 * rng.standard_normal(50) for name in comparators}
    outputs = {name: constant(name, range(50), value) for name, value in values.items()}
    record = combine(chains, outputs, name="net").record
    middle = (2.0 * values["EAST_L-WEST_L"] + values["MID_L-WEST_L"] + values["EAST_L-MID_L"]) / 3.0
    expected = values["WEST_L-WEST_SR"] + middle + values["EAST_YB-EAST_L"]
    np.testing.assert_allclose(record.y, expected, rtol=1e-9, atol=1e-30)


def test_the_combination_is_the_best_linear_unbiased_one():
    """A second route: dense generalised least squares of one gate with all oscillators unknown."""
    chains = triangle()
    noise = {"EAST_YB-WEST_SR": 1.7, "FIBRE_L-WEST_SR": 0.6, "EAST_YB-FIBRE_L": 1.1}
    z = {"EAST_YB-WEST_SR": 1e-15, "FIBRE_L-WEST_SR": -2e-15, "EAST_YB-FIBRE_L": 4e-15}
    outputs = {name: constant(name, range(3), value) for name, value in z.items()}
    record = combine(chains, outputs, name="net", noise=noise).record
    # Unknowns: offsets of the transfer laser and of the far clock, against the near clock.
    design = np.array([[0.0, 1.0], [1.0, 0.0], [-1.0, 1.0]])
    weight = np.diag([noise[name] ** -2.0 for name in z])
    normal = design.T @ weight @ design
    estimate = np.linalg.solve(normal, design.T @ weight @ np.array(list(z.values())))
    np.testing.assert_allclose(record.y, estimate[1], rtol=1e-12)


def test_loops_of_comparators_are_found():
    chains = triangle()
    outputs = {
        "EAST_YB-WEST_SR": constant("a", range(10), 1e-15),
        "FIBRE_L-WEST_SR": constant("b", range(5, 20), 2e-15),
        "EAST_YB-FIBRE_L": constant("c", range(5, 15), 3e-15),
    }
    (loop,) = loops_of(chains, outputs)
    np.testing.assert_array_equal(loop.series.tick, np.arange(5, 10))
    np.testing.assert_allclose(np.abs(loop.series.y), 4e-15, rtol=1e-12)
    assert loops_of(chains[:1], outputs) == []


def test_gates_off_the_grid_and_other_intervals_are_refused():
    chain = printed_chain(
        [
            entry("FIBRE_L", "WEST_SR", nu_b=LASER, nu_a=SR),
            entry("EAST_YB", "FIBRE_L", nu_b=YB, nu_a=LASER),
        ]
    )
    tick = np.arange(20)
    ones = np.ones(20)

    def outputs(shift, interval):
        step = int(interval * 1e9)
        return {
            "FIBRE_L-WEST_SR": Record("one", tick * 10**9, ones, ones > 0, 1.0, tick),
            "EAST_YB-FIBRE_L": Record("two", tick * step + shift, ones, ones > 0, interval, tick),
        }

    with pytest.raises(DataError, match=r"gates do not lie on the grid.*off by 0\.4"):
        combine([chain], outputs(400_000_000, 1.0), name="x")
    with pytest.raises(DataError, match="different gate times"):
        combine([chain], outputs(0, 2.0), name="x")
    with pytest.raises(DataError, match="no valid epoch in common"):
        combine([chain], outputs(100 * 10**9, 1.0), name="x")
