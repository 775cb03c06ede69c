"""A plan as a dataset: sessions, and u of every target against time."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from clockgeo.planning.results import PlanResult

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["plan_dataset"]


def plan_dataset(result: PlanResult) -> xr.Dataset:
    """Return the plan as an xarray dataset that follows the CF conventions.

    Parameters
    ----------
    result : PlanResult

    Returns
    -------
    xarray.Dataset
        Over `session`: days, uptime and u; over `target`: wanted and predicted u; over `target`,
        `length` and `term`: u against the days of all sessions.
    """
    import xarray as xr

    sessions, targets = result.sessions, result.targets
    terms = list(dict.fromkeys(name for curve in result.reach for name in curve.terms))
    length = len(result.reach[0].days)
    parts = np.zeros((len(targets), length, len(terms)))
    for place, curve in enumerate(result.reach):
        for column, name in enumerate(terms):
            parts[place, :, column] = curve.terms.get(name, (0.0,) * length)
    variables: dict[str, Any] = {
        name: (
            "session",
            [getattr(one, name) for one in sessions],
            {"units": unit, "long_name": words},
        )
        for name, unit, words in (
            ("days", "d", "length of the session"),
            ("uptime", "1", "expected share of valid time"),
            ("u_statistical", "1", "standard uncertainty of y from noise, the session alone"),
            ("u_systematic", "1", "standard uncertainty of y from effects, the session alone"),
        )
    }
    variables |= {
        name: (
            "target",
            [getattr(one, name) for one in targets],
            {"units": "m", "long_name": words},
        )
        for name, words in (
            ("required_u", "wanted standard uncertainty"),
            ("predicted_u", "predicted standard uncertainty"),
            ("floor_u", "predicted standard uncertainty with endless time"),
        )
    }
    variables["u"] = (
        ("target", "length"),
        [curve.u for curve in result.reach],
        {"units": "m", "long_name": "predicted standard uncertainty if all sessions were longer"},
    )
    variables["u_term"] = (
        ("target", "length", "term"),
        parts,
        {"units": "m", "long_name": "part of a term; the squares add up to u squared"},
    )
    coordinates = {
        "session": ("session", [one.id for one in sessions], {"long_name": "session"}),
        "target": (
            "target",
            [f"{one.from_end} to {one.to_end}" for one in targets],
            {"long_name": "target, second minus first"},
        ),
        "length": (
            "length",
            list(result.reach[0].days),
            {"units": "d", "long_name": "days of all sessions together"},
        ),
        "term": ("term", terms, {"long_name": "term of the uncertainty budget"}),
    }
    return xr.Dataset(
        variables,
        coordinates,
        {
            "Conventions": "CF-1.12",
            "title": result.name,
            "source": f"clockgeo {result.provenance.version}",
            "comment": result.conventions.caution,
            "schema": result.schema_name,
        },
    )
