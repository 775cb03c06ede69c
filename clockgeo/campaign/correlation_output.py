"""What results have in common, on disk: CSV with every cause, and variables of the dataset."""

from __future__ import annotations

import csv
import io
from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.campaign.results import LevelResult

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["correlations_csv", "with_correlations"]


def correlations_csv(result: LevelResult) -> str:
    """Correlations as CSV, a line for each shared cause; the parts of a pair add up to it."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["kind", "first", "second", "correlation (1)", "cause", "part (1)"])
    for one in result.correlations:
        pair = [one.kind, one.first, one.second, repr(one.coefficient)]
        writer.writerows([*pair, cause, repr(part)] for cause, part in one.parts.items())
    return text.getvalue()


def with_correlations(dataset: xr.Dataset, result: LevelResult) -> xr.Dataset:
    """Add the correlation matrix of the sessions and their closed loops to a result's dataset."""
    order = [session.id for session in result.sessions]
    matrix = np.eye(len(order))
    for one in result.correlations:
        if one.kind == "session":
            i, j = order.index(one.first), order.index(one.second)
            matrix[i, j] = matrix[j, i] = one.coefficient
    closures = result.closures
    loops = [
        " ".join(f"{sign:+d} {name}" for sign, name in zip(one.signs, one.sessions, strict=True))
        for one in closures
    ]
    of_loop = [
        ("misclosure", [one.misclosure for one in closures], "m2 s-2", "misclosure of the loop"),
        ("u_misclosure", [one.u for one in closures], "m2 s-2", "its standard uncertainty"),
        ("closure_verdict", [one.verdict for one in closures], None, "verdict on the loop"),
    ]
    variables: dict[str, Any] = {
        name: ("loop", values, {"long_name": words} | ({"units": unit} if unit else {}))
        for name, values, unit, words in of_loop
    }
    variables["session_correlation"] = (
        ("session", "other_session"),
        matrix,
        {"units": "1", "long_name": "correlation coefficients of the sessions' y"},
    )
    return dataset.assign_coords(
        other_session=("other_session", order, {"long_name": "session"}),
        loop=("loop", loops, {"long_name": "signed sessions of the loop"}),
    ).assign(variables)
