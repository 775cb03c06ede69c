"""Pole tide, loading and uplift of a campaign's sites: named in the document, felt in y."""

from __future__ import annotations

import numpy as np
import pytest

from clockgeo.campaign import Campaign
from clockgeo.campaign.measuring import tide_of
from clockgeo.campaign.site_tides import tide_tables, years_from_epoch
from clockgeo.constants import SPEED_OF_LIGHT
from clockgeo.errors import DataError
from clockgeo.gravity import TideSystem
from clockgeo.levelling.session_rows import SessionMean, systematic_loads, transfer_difference
from clockgeo.times import DAY_NS, SECOND_NS, tai_from_iso

NOON = tai_from_iso("2027-05-06T12:00:00Z")
M2 = "constituent,doodson,offset_deg,height_amplitude_m,height_phase_deg,"
M2 += "potential_amplitude_m2_s2,potential_phase_deg\nM2,255.555,0,0.03,40,0.02,10\n"
POLE = "epoch_utc,x_arcsec,y_arcsec\n2027-05-01T00:00:00,0.4,0.2\n2027-06-01T00:00:00,0.4,0.2\n"


def campaign(head=None, summit=None):
    return Campaign.model_validate(
        {
            "campaign": {
                "name": "two sites",
                "tide_system": "zero_tide",
                "reference_site": "valley",
                **(head or {}),
            },
            "site": [
                {"id": "valley", "latitude": 45.0, "longitude": 11.0, "geopotential_number": 0.0},
                {"id": "summit", "latitude": 45.5, "longitude": 12.0, **(summit or {})},
            ],
            "clock": [{"id": "a", "transition": "87Sr"}, {"id": "b", "transition": "87Sr"}],
            "session": [
                {
                    "id": "one",
                    "numerator": {"clock": "a", "site": "summit"},
                    "denominator": {"clock": "b", "site": "valley"},
                    "start": "2027-05-06T00:00:00Z",
                    "hours": 24,
                }
            ],
        }
    )


def tide(document, folder):
    epochs = NOON + np.arange(0, 43_200, 600) * SECOND_NS
    return tide_of(document, document.sessions[0], epochs, folder=folder).at_epochs


def mean(document, years):
    session = document.sessions[0]
    return SessionMean(
        id=session.id,
        numerator=document.clock("a"),
        numerator_site=document.site("summit"),
        denominator=document.clock("b"),
        denominator_site=document.site("valley"),
        links=(),
        start_ns=NOON,
        y=0.0,
        years=years,
    )


def test_loading_of_one_site_adds_its_own_waves(tmp_path):
    (tmp_path / "load.csv").write_text(M2, encoding="utf-8")
    plain = tide(campaign(), tmp_path)
    loaded = tide(campaign(summit={"load": "load.csv", "gravity": 9.8}), tmp_path)
    wave = (loaded - plain) * SPEED_OF_LIGHT.value**2
    # Over half a day the wave passes crest and trough: the amplitudes of uplift and masses add as
    # vectors, here with 30 degrees between them (law of cosines).
    uplift, masses = 9.8 * 0.03, 0.02
    amplitude = np.sqrt(uplift**2 + masses**2 - 2 * uplift * masses * np.cos(np.radians(30.0)))
    assert np.max(np.abs(wave)) == pytest.approx(amplitude, rel=0.01)


def test_the_pole_tide_differs_little_between_neighbours(tmp_path):
    (tmp_path / "pole.csv").write_text(POLE, encoding="utf-8")
    both = campaign(head={"pole_coordinates": "pole.csv"})
    change = (tide(both, tmp_path) - tide(campaign(), tmp_path)) * SPEED_OF_LIGHT.value**2
    # Half of Omega^2 r^2 sin(2 colatitude) m, 0.05 m2 s-2 for 0.4", changes by a few per cent.
    assert 1e-5 < np.max(np.abs(change)) < 5e-3


def test_tables_are_listed_and_missing_ones_named(tmp_path):
    document = campaign(head={"pole_coordinates": "pole.csv"}, summit={"load": "load.csv"})
    assert tide_tables(document) == ["load.csv", "pole.csv"]
    with pytest.raises(DataError, match=r"a table for the tide is not there: pole\.csv"):
        tide(document, tmp_path)


def test_uplift_since_the_epoch_goes_into_the_difference():
    rising = campaign(
        head={"epoch": "2017-05-06"},
        summit={"gravity": 9.8, "uplift_rate": 0.004, "u_uplift_rate": 0.0005},
    )
    years = years_from_epoch(rising, NOON)
    assert years == pytest.approx(3652 / 365.25, abs=1e-9)  # 2017-05-06 to 2027-05-06: 3652 days
    still = transfer_difference(mean(rising, 0.0), TideSystem.ZERO_TIDE)
    moved = transfer_difference(mean(rising, years), TideSystem.ZERO_TIDE)
    assert moved - still == pytest.approx(9.8 * 0.004 * years, rel=1e-12)
    loads = {str(key): load for key, load in systematic_loads(mean(rising, years), {}).items()}
    assert loads["summit · uplift rate"] == pytest.approx(9.8 * 0.0005 * years, rel=1e-12)


def test_without_an_epoch_no_time_passes():
    assert years_from_epoch(campaign(), NOON + 1000 * DAY_NS) == 0.0
