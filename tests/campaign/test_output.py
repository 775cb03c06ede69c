"""Results on disk: back through the library, CF attributes, nothing half written."""

from __future__ import annotations

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
        xr.testing.assert_equal(stored.load().drop_attrs(), result_dataset(result).drop_attrs())


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
