"""Small invented plans, put together in a test rather than read from a file."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path

from clockgeo.campaign.document import Document
from clockgeo.campaign.schema import Campaign

START = datetime(2028, 1, 1, tzinfo=UTC)
C_SQUARED = 299_792_458.0**2


def session(name, site, start_day, days, *, uptime=1.0, other="home", **more):
    """One planned session: clock "a" at a site against clock "b" elsewhere."""
    return {
        "id": name,
        "numerator": {"clock": "a", "site": site},
        "denominator": {"clock": "b", "site": other},
        "start": START + timedelta(days=start_day),
        "hours": 24.0 * days,
        "uptime": uptime,
        **more,
    }


def plan_document(sessions=(), *, a=None, b=None, u_height=0.1, folder=Path(), **tables):
    """A campaign between "home" (reference) and "away", without tides unless asked for."""
    head = {
        "name": "invented plan",
        "tide_system": "zero_tide",
        "reference_site": "home",
        "tide": "none",
        **tables.pop("head", {}),
    }
    content = {
        "campaign": head,
        "site": [
            {"id": "home", "latitude": 50.0, "longitude": 8.0, "geopotential_number": 0.0},
            {"id": "away", "latitude": 51.0, "longitude": 9.0},
        ],
        "clock": [
            {"id": "a", "transition": "87Sr", **(a or {})},
            {"id": "b", "transition": "87Sr", **(b or {})},
        ],
        "session": list(sessions),
        "target": {"difference": [{"from": "home", "to": "away", "u_height": u_height}]},
        **tables,
    }
    return Document(Campaign.model_validate(content), folder / "campaign.toml")


def in_frequency(prediction, goal):
    """Predicted u of a goal as fractional frequency."""
    return prediction.u(goal) * goal.gravity / C_SQUARED
