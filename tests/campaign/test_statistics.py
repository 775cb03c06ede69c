"""What the data of a campaign say of the means: overlap of pairs, dead time, short records."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from clockgeo.campaign import Campaign, level_measured, measure_record
from clockgeo.frequency import (
    NoiseModel,
    Record,
    TickSeries,
    dead_time_variance,
    mean_covariance,
    uptime_windows,
)
from clockgeo.times import SECOND_NS, tai_from_iso

START = tai_from_iso("2027-05-03T00:00:00Z")


def campaign(sessions, links=(), *, clocks="abc", floor=0.0, sites=("home",)):
    instability = {"white_fm": 1e-15, "flicker_fm": floor}
    clocks = [{"id": name, "transition": "87Sr", "instability": instability} for name in clocks]
    return Campaign.model_validate(
        {
            "campaign": {
                "name": "one site",
                "tide_system": "zero_tide",
                "reference_site": "home",
                "scatter": "none",
            },
            "site": [
                {"id": "home", "latitude": 50.0, "longitude": 8.0, "geopotential_number": 0.0},
                *({"id": name, "latitude": 50.0, "longitude": 9.0} for name in sites[1:]),
            ],
            "clock": clocks,
            "link": list(links),
            "session": [
                {
                    "id": f"{n}{d} {k}",
                    "numerator": {"clock": n, "site": "home"},
                    "denominator": {"clock": d, "site": "home"},
                    "links": [link["id"] for link in links],
                }
                for k, (n, d) in enumerate(sessions)
            ],
        }
    )


WHITE = 2.0**0.5 * 1e-15


def record(rng, ticks, *, name="r", white=WHITE):
    tick = START // (10 * SECOND_NS) + np.asarray(ticks)
    y = white / np.sqrt(10.0) * rng.standard_normal(tick.size)
    return Record(name, tick * 10 * SECOND_NS, y, np.ones(tick.size, bool), 10.0, tick)


def levelled(document, records, folder):
    measured = [
        measure_record(document, session, one, folder=folder)
        for session, one in zip(document.sessions, records, strict=True)
    ]
    return level_measured(document, measured, folder=folder)


def solved(document, records, folder):
    return levelled(document, records, folder).result


def white_covariance(found, share, overlap, first, second):
    """Least fitted white noise of two pairs, of which `share` is common during `overlap` s."""
    white = min(group.model.white_fm for group in found.evidence.groups)
    return share * white**2 * overlap / (first * second)


def covariance_of_sessions(result):
    (pair,) = [one for one in result.correlations if one.kind == "session"]
    first, second = (one.u_statistical for one in result.sessions)
    return pair.coefficient * first * second


def test_pairs_with_a_common_clock_are_correlated_while_they_overlap(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")])
    records = [record(rng, range(6000)), record(rng, range(3000, 9000))]
    found = levelled(document, records, tmp_path)
    # Half of each variance is the common clock's, half of the time is common.
    expected = white_covariance(found, 0.5, 30_000.0, 60_000.0, 60_000.0)
    assert covariance_of_sessions(found.result) == pytest.approx(expected, rel=1e-9)


def test_pairs_that_do_not_overlap_are_not(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")])
    records = [record(rng, range(3000)), record(rng, range(3000, 6000))]
    assert solved(document, records, tmp_path).correlations == ()


def test_overlap_counts_time_where_intervals_differ(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")])
    coarse = record(rng, range(6000))
    tick = START // (5 * SECOND_NS) + np.arange(6000, 18_000)
    y = WHITE / np.sqrt(5.0) * rng.standard_normal(tick.size)
    fine = Record("fine", tick * 5 * SECOND_NS, y, np.ones(tick.size, bool), 5.0, tick)
    found = levelled(document, [coarse, fine], tmp_path)
    expected = white_covariance(found, 0.5, 30_000.0, 60_000.0, 60_000.0)
    assert covariance_of_sessions(found.result) == pytest.approx(expected, rel=1e-9)


def test_a_link_at_work_for_two_pairs_correlates_them(rng, tmp_path):
    link = {"id": "span", "instability": {"white_fm": 3e-15}}
    document = campaign([("a", "b"), ("c", "d")], [link], clocks="abcd")
    white = (2.0 + 9.0) ** 0.5 * 1e-15
    records = [record(rng, range(6000), white=white) for _ in range(2)]
    found = levelled(document, records, tmp_path)
    expected = white_covariance(found, 9.0 / 11.0, 60_000.0, 60_000.0, 60_000.0)
    assert covariance_of_sessions(found.result) == pytest.approx(expected, rel=1e-9)


def test_the_floor_of_a_common_clock_correlates_pairs_that_do_not_overlap(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")], floor=1e-17)
    records = [record(rng, range(3000)), record(rng, range(3000, 6000))]
    result = solved(document, records, tmp_path)
    u = [one.u_statistical for one in result.sessions]
    (pair,) = result.correlations
    one = NoiseModel(flicker_fm=1e-17)
    series = [TickSeries(np.arange(*ends), np.zeros(3000)) for ends in ((0, 3000), (3000, 6000))]
    shared = mean_covariance(one, series, interval=10.0)[0, 1]
    # Of the floors stated for a and c, 2e-34 together, half is of the clock in both.
    assert pair.coefficient == pytest.approx(shared / (u[0] * u[1]), rel=1e-3)


def test_numbers_and_differences_are_correlated_too(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")], sites=("home", "near", "far"))
    placed = [
        one.model_copy(
            update={"numerator": one.numerator.model_copy(update={"site": site})},
        )
        for one, site in zip(document.sessions, ("near", "far"), strict=True)
    ]
    document = document.model_copy(update={"sessions": tuple(placed)})
    records = [record(rng, range(6000)), record(rng, range(3000, 9000))]
    result = solved(document, records, tmp_path)
    by_kind = {one.kind: one for one in result.correlations if "home" not in one.first}
    matrix, order = np.array(result.covariance.matrix), result.covariance.order
    near, far = order.index("near"), order.index("far")
    expected = matrix[near, far] / np.sqrt(matrix[near, near] * matrix[far, far])
    assert by_kind["geopotential_number"].coefficient == pytest.approx(expected, rel=1e-9)
    differences = [one for one in result.correlations if one.kind == "difference"]
    assert {one.first for one in differences} == {"near - home", "far - home"}
    for one in result.correlations:
        assert sum(one.parts.values()) == pytest.approx(one.coefficient, abs=1e-12)


def test_scatter_by_stay_is_shared_within_a_configuration(rng, tmp_path):
    """Two sessions at each of three stays: offsets of stays show, and do not average within one."""
    document = campaign([("a", "c")] * 6, sites=("home", "near"))
    head = document.head.model_copy(update={"scatter": "by_stay"})
    sites = ["home", "home", "near", "near", "home", "home"]
    placed = [
        one.model_copy(
            update={"numerator": one.numerator.model_copy(update={"site": site})},
        )
        for one, site in zip(document.sessions, sites, strict=True)
    ]
    document = document.model_copy(update={"head": head, "sessions": tuple(placed)})
    records = [record(rng, range(9000 * k, 9000 * k + 4000)) for k in range(6)]
    offsets = np.repeat([4e-17, 0.0, -4e-17], 2)
    records = [replace(one, y=one.y + shift) for one, shift in zip(records, offsets, strict=True)]
    result = solved(document, records, tmp_path)
    scatter = result.scatter.standard_deviation
    # Of two stays at home the sample deviation: 8e-17/√2, less some 1e-17 of noise.
    assert scatter == pytest.approx(8e-17 / 2**0.5, rel=0.1)
    alike = [one for one in result.correlations if one.coefficient > 0.9]
    together = {one.second for one in alike if one.first == "ac 0"}
    assert together == {"ac 1"}
    # One degree of freedom is left, and the difference of the sites carries √1.5 of the offset.
    (difference,) = result.differences
    assert difference.u / 299_792_458.0**2 == pytest.approx(1.5**0.5 * scatter, rel=0.1)


def test_a_flywheel_over_the_downtime_adds_its_dead_time(rng, tmp_path):
    flywheel = NoiseModel(white_fm=1e-13, flicker_fm=3e-16)
    ticks = np.concatenate([np.arange(0, 1500), np.arange(4000, 5500), np.arange(9000, 10_000)])
    plain = {"id": "satellite"}
    carried = {"id": "satellite", "flywheel": flywheel.model_dump()}
    u = []
    for link in (plain, carried):
        document = campaign([("a", "c")], [link])
        draw = record(np.random.default_rng(1), ticks)
        result = solved(document, [draw], tmp_path)
        u.append(result.sessions[0].u_statistical)
    added = dead_time_variance(flywheel, uptime_windows(ticks, 10.0), 100_000.0)
    assert u[1] ** 2 - u[0] ** 2 == pytest.approx(added, rel=1e-6)
    assert any("a flywheel over the downtime adds" in note for note in result.notes)


def test_a_record_too_short_for_a_fit_takes_the_stated_noise(rng, tmp_path):
    result = solved(campaign([("a", "c")]), [record(rng, range(8))], tmp_path)
    assert result.noise[0].source == "stated in the document"
    assert result.sessions[0].u_statistical == pytest.approx(
        np.sqrt(2.0) * 1e-15 / np.sqrt(80.0), rel=1e-9
    )
    assert any("records too short for a fit" in note for note in result.notes)
