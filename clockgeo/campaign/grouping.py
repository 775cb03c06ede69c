"""Sessions whose noise is one process, and the noise model fitted to them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from clockgeo.campaign.measuring import Measured
from clockgeo.campaign.schema import Campaign
from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel, TickSeries, fit_noise
from clockgeo.levelling.session_rows import SessionMean, same_expectation

__all__ = ["Group", "fitted_groups", "pair_series", "stated_model"]

_SCATTER_FROM = 4
"""Sessions from which excess scatter between them can stand for a floor within them."""
_MATTERS = 0.1
"""A link counts in the grouping where its deviation exceeds this share of the clocks'."""


@dataclass(frozen=True, eq=False)
class Group:
    """Sessions whose noise is one process: same clocks, alike links, one sampling interval.

    Attributes
    ----------
    name : str
    members : tuple of int
        Places in the list of sessions.
    model : NoiseModel
        What uncertainties follow, no less than stated: the likeliest where excess scatter between
        sessions is estimated beside it, else averaged over what the data allow.
    likeliest : NoiseModel
        What is reported as the noise of the pair.
    fitted : bool
        False where the records are too short and the document's model is used.
    degrees_of_freedom : float
        Of the u that `model` gives a mean; infinite for a stated model.
    """

    name: str
    members: tuple[int, ...]
    model: NoiseModel
    likeliest: NoiseModel
    fitted: bool
    degrees_of_freedom: float


def fitted_groups(
    campaign: Campaign, measured: Sequence[Measured], means: Sequence[SessionMean]
) -> tuple[Group, ...]:
    """Group the sessions and fit the noise of every group.

    Where no excess scatter between sessions is estimated, those that measure the same thing share a
    mean: what they differ by tells of the slow noise.

    Raises
    ------
    DataError
        If records are too short for a fit and the document states no instability.
    """
    alike = same_expectation(means)
    return tuple(
        _fitted(campaign, name, places, measured, alike)
        for name, places in _grouped(campaign, measured).items()
    )


def _grouped(campaign: Campaign, measured: Sequence[Measured]) -> dict[str, list[int]]:
    groups: dict[str, list[int]] = {}
    for place, one in enumerate(measured):
        name = " - ".join(one.pair)
        links = _links_that_matter(campaign, one)
        if links:
            name += f" over {', '.join(links)}"
        interval = round(one.record.interval, 6)
        key = f"{name}, every {interval:g} s"
        groups.setdefault(key, []).append(place)
    return groups


def _links_that_matter(campaign: Campaign, one: Measured) -> list[str]:
    tau = np.geomspace(100.0, 1e5, 9)
    clocks = campaign.clock(one.pair[0]).instability.combined(
        campaign.clock(one.pair[1]).instability
    )
    limit = _MATTERS**2 * clocks.allan_variance(tau)
    return [
        name
        for name in one.session.links
        if np.any(campaign.link(name).instability.allan_variance(tau) > limit) and np.any(limit > 0)
    ]


def pair_series(one: Measured) -> TickSeries:
    """Valid samples with the sign of the pair, so that reversed sessions are one process."""
    return TickSeries(one.series.tick, one.direction * one.series.y)


def _fitted(
    campaign: Campaign,
    name: str,
    places: Sequence[int],
    measured: Sequence[Measured],
    alike: Sequence[int],
) -> Group:
    scatters = campaign.head.scatter != "none" and len(measured) >= _SCATTER_FROM
    owners = list(range(len(places))) if scatters else _renumbered([alike[k] for k in places])
    series = [pair_series(measured[place]) for place in places]
    interval = measured[places[0]].record.interval
    try:
        fit = fit_noise(series, interval=interval, means=owners)
    except DataError:
        stated = stated_model(campaign, measured[places[0]])
        if not np.any(stated.allan_variance([1.0, 1e4]) > 0.0):
            raise
        return Group(
            name, tuple(places), stated, stated, fitted=False, degrees_of_freedom=float("inf")
        )
    return Group(
        name,
        tuple(places),
        _no_less_than_stated(
            # A floor that hides within sessions shows between them, as excess scatter.
            fit.model if scatters else fit.averaged,
            stated_model(campaign, measured[places[0]]),
        ),
        fit.model,
        fitted=True,
        degrees_of_freedom=float(fit.contrasts) if scatters else fit.degrees_of_freedom,
    )


def _renumbered(numbers: Sequence[int]) -> list[int]:
    places = {number: place for place, number in enumerate(dict.fromkeys(numbers))}
    return [places[number] for number in numbers]


def _no_less_than_stated(fitted: NoiseModel, stated: NoiseModel) -> NoiseModel:
    """Keep the stated slow noise where the data are too short to see it."""
    return fitted.model_copy(
        update={
            name: max(getattr(fitted, name), getattr(stated, name))
            for name in ("flicker_fm", "random_walk_fm")
        }
    )


def stated_model(campaign: Campaign, one: Measured) -> NoiseModel:
    """Instability of the clocks and links of a session together, as the document states it."""
    clocks = [campaign.clock(place.clock).instability for place in one.session.places]
    links = [campaign.link(link).instability for link in one.session.links]
    return NoiseModel().combined(*clocks, *links)
