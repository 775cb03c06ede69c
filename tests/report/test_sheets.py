"""Tables: what people read and what programs read are the same."""

from __future__ import annotations

import csv
import io

from clockgeo.report.numbers import ABSENT
from clockgeo.report.sheets import Sheet, count, measured, plain, words


def sheet(*rows):
    columns = [("site", "site"), ("C / m² s⁻²", ("C (m2 s-2)", "u (m2 s-2)")), ("n", "n")]
    return Sheet.of("s", "caption", columns, rows)


def read(text):
    return list(csv.reader(io.StringIO(text)))


def test_csv_has_units_and_full_precision():
    table = sheet((words("Harbel"), measured(13630.720000000003, 0.5123456789), count(4)))
    assert read(table.csv) == [
        ["site", "C (m2 s-2)", "u (m2 s-2)", "n"],
        ["Harbel", "13630.720000000003", "0.5123456789", "4"],
    ]
    assert table.rows[0][1].text.endswith("630.72(51)")


def test_csv_survives_commas_quotes_and_lines():
    name = 'a "site", in\ntwo lines'
    assert read(sheet((words(name), measured(1.0, 0.1), count(1))).csv)[1][0] == name


def test_spreadsheets_find_no_formula_in_names():
    for start in ("=", "+", "-", "@"):
        table = sheet((words(f"{start}1+1"), measured(-1.0, 0.1), count(1)))
        assert read(table.csv)[1][:2] == [f"'{start}1+1", "-1.0"]


def test_what_is_absent_is_a_dash_and_an_empty_field():
    table = sheet((words("x"), measured(None, None), plain("", None)))
    assert [cell.text for cell in table.rows[0][1:]] == [ABSENT, ABSENT]
    assert read(table.csv)[1] == ["x", "", "", ""]


def test_units_of_a_step_are_shown_only():
    cell = measured(1.5e-17, 1.2e-18, step=1e-18)
    assert cell.text == "15.0(1.2)"
    assert cell.values == (1.5e-17, 1.2e-18)
