"""What the data of a campaign say of the means: overlap of pairs, dead time, short records."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.campaign import Campaign, level_measured, measure_record
from clockgeo.frequency import NoiseModel, Record, dead_time_variance, uptime_windows
from clockgeo.times import SECOND_NS, tai_from_iso

START = tai_from_iso("2027-05-03T00:00:00Z")


def campaign(sessions, links=()):
    clocks = [
        {"id": name, "transition": "87Sr", "instability": {"white_fm": 1e-15}} for name in "abc"
    ]
    return Campaign.model_validate(
        {
            "campaign": {
                "name": "one site",
                "tide_system": "zero_tide",
                "reference_site": "home",
                "scatter": "none",
            },
            "site": [
                {"id": "home", "latitude": 50.0, "longitude": 8.0, "geopotential_number": 0.0}
            ],
            "clock": clocks,
            "link": list(links),
            "session": [
                {
                    "id": f"{n}{d}",
                    "numerator": {"clock": n, "site": "home"},
                    "denominator": {"clock": d, "site": "home"},
                    "links": [link["id"] for link in links],
                }
                for n, d in sessions
            ],
        }
    )


WHITE = 2.0**0.5 * 1e-15


def record(rng, ticks, *, name="r", white=WHITE):
    tick = START // (10 * SECOND_NS) + np.asarray(ticks)
    y = white / np.sqrt(10.0) * rng.standard_normal(tick.size)
    return Record(name, tick * 10 * SECOND_NS, y, np.ones(tick.size, bool), 10.0, tick)


def solved(document, records, folder):
    measured = [
        measure_record(document, session, one, folder=folder)
        for session, one in zip(document.sessions, records, strict=True)
    ]
    return level_measured(document, measured, folder=folder).result


def test_pairs_with_a_common_clock_are_correlated_while_they_overlap(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")])
    records = [record(rng, range(6000)), record(rng, range(3000, 9000))]
    result = solved(document, records, tmp_path)
    (pair,) = result.correlations
    # Half of each variance is the common clock's, half of the time is common: a quarter.
    expected = (
        0.25
        * (1e-15**2 * 2 / 60_000)
        / (result.sessions[0].u_statistical * result.sessions[1].u_statistical)
    )
    assert pair.parts["noise of clocks and links"] == pytest.approx(expected, rel=1e-6)


def test_pairs_that_do_not_overlap_are_not(rng, tmp_path):
    document = campaign([("a", "c"), ("b", "c")])
    records = [record(rng, range(3000)), record(rng, range(3000, 6000))]
    assert solved(document, records, tmp_path).correlations == ()


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
