"""Results on disk: back through the library, CF attributes, nothing half written."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
import xarray as xr

from clockgeo.campaign import (
    level,
    prepare_folder,
    read_document,
    read_result,
    result_dataset,
    write_result,
)
from clockgeo.errors import DataError, OutputError


@pytest.fixture(scope="module")
def result(project):
    return level(read_document(project / "examples" / "saddle" / "campaign.toml")).result


def test_json_comes_back_as_it_went(result, tmp_path):
    write_result(result, tmp_path)
    assert read_result(tmp_path) == result
    assert read_result(tmp_path / "result.json") == result


def test_netcdf_comes_back_as_it_went(result, tmp_path):
    write_result(result, tmp_path)
    with xr.open_dataset(tmp_path / "result.nc") as stored:
        same = stored.load()[list(result_dataset(result).variables)]
        xr.testing.assert_equal(same.drop_attrs(), result_dataset(result).drop_attrs())


def test_correlations_come_out_with_their_causes(result, tmp_path):
    write_result(result, tmp_path)
    with (tmp_path / "correlations.csv").open(encoding="utf-8", newline="") as lines:
        rows = list(csv.DictReader(lines))
    sessions = [one for one in result.correlations if one.kind == "session"]
    assert sessions
    for one in sessions:
        mine = [
            row
            for row in rows
            if (row["kind"], row["first"], row["second"]) == (one.kind, one.first, one.second)
        ]
        assert {row["cause"] for row in mine} == set(one.parts)
        total = sum(float(row["part (1)"]) for row in mine)
        assert total == pytest.approx(one.coefficient, abs=1e-12)
    with xr.open_dataset(tmp_path / "result.nc") as stored:
        matrix = stored["session_correlation"].to_numpy()
        order = stored["other_session"].to_numpy().astype(str).tolist()
        loops = stored.sizes.get("loop", 0)
        misclosures = stored["misclosure"].to_numpy() if loops else []
    one = sessions[0]
    assert matrix[order.index(one.first), order.index(one.second)] == one.coefficient
    assert np.all(np.diag(matrix) == 1.0)
    assert np.allclose(matrix, matrix.T)
    assert list(misclosures) == [one.misclosure for one in result.closures]


def test_every_variable_has_a_unit_or_is_text(result):
    """CF-1.12, section 3.1: units for all that has a dimension; names from the standard's rules."""
    dataset = result_dataset(result)
    assert dataset.attrs["Conventions"] == "CF-1.12"
    for name, variable in dataset.variables.items():
        assert name.isidentifier(), name
        assert "long_name" in variable.attrs or "standard_name" in variable.attrs, name
        if np.issubdtype(variable.dtype, np.floating):
            assert variable.attrs["units"], name
    ancillary = dataset["geopotential_number"].attrs["ancillary_variables"]
    assert ancillary in dataset


def test_coordinates_are_found_by_their_attributes(result):
    """cf-xarray, a general-purpose reader of CF attributes, finds latitude and longitude."""
    import cf_xarray  # noqa: F401  (registers the accessor)

    dataset = result_dataset(result)
    assert dataset.cf["latitude"].to_numpy().tolist() == [47.2, 46.85]
    assert dataset.cf["longitude"].to_numpy().tolist() == [11.1, 11.95]


def test_results_are_not_replaced_unasked(result, tmp_path):
    write_result(result, tmp_path)
    with pytest.raises(OutputError, match="exists already"):
        write_result(result, tmp_path)
    with pytest.raises(OutputError, match=r"results exist already: result\.json"):
        prepare_folder(tmp_path, ("result.json", "report.html"), replace=False)
    write_result(result, tmp_path, replace=True)


@pytest.mark.parametrize(
    ("damage", "message"),
    [
        (lambda text: text[:-40], "not a JSON object"),
        (lambda text: "[]" + text[:0], "not a JSON object"),
        (lambda text: text.replace("clockgeo/level/1", "clockgeo/level/9"), "not a result of this"),
        (lambda text: text.replace('"uptime"', '"uptme"'), "does not follow its schema"),
    ],
)
def test_damaged_results_are_refused(result, tmp_path, damage, message):
    write_result(result, tmp_path)
    path = tmp_path / "result.json"
    path.write_text(damage(path.read_text(encoding="utf-8")), encoding="utf-8")
    with pytest.raises(DataError, match=message):
        read_result(tmp_path)


def test_a_missing_result_is_told(tmp_path):
    with pytest.raises(DataError, match="no result here"):
        read_result(tmp_path)


def test_numbers_keep_their_shortest_exact_form(result, tmp_path):
    write_result(result, tmp_path)
    told = json.loads((tmp_path / "result.json").read_text(encoding="utf-8"))
    assert told["sites"][1]["geopotential_number"] == result.sites[1].geopotential_number
