"""An independent sky: the numerical ephemeris DE421 and the Earth rotation of skyfield."""

from __future__ import annotations

import warnings
from collections.abc import Callable

import numpy as np
import pytest

from clockgeo.gravity import SkyPositions
from clockgeo.times import tt_julian_date, utc_julian_date


@pytest.fixture(scope="session")
def independent_sky() -> Callable[[np.ndarray], SkyPositions]:
    """Positions as `sky_positions` gives them (UT1 = UTC), by other people's code and data."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # what these packages warn of when imported
        import de421
        from jplephem.ephem import Ephemeris
        from skyfield.api import load
        from skyfield.framelib import itrs
    ephemeris = Ephemeris(de421)

    def positions(tai_ns: np.ndarray) -> SkyPositions:
        terrestrial = np.atleast_1d(sum(tt_julian_date(tai_ns)))
        universal = np.atleast_1d(sum(utc_julian_date(tai_ns)))
        moon = ephemeris.position("moon", terrestrial)
        earth = ephemeris.position("earthmoon", terrestrial) - moon / (1.0 + ephemeris.EMRAT)
        sun = ephemeris.position("sun", terrestrial) - earth
        moment = load.timescale(delta_t=0.0, builtin=True).tt_jd(terrestrial)
        moment.delta_t = (terrestrial - universal) * 86_400.0
        rotation = itrs.rotation_at(moment)
        return SkyPositions(
            *(np.einsum("ijn,jn->ni", rotation, body * 1e3) for body in (moon, sun))
        )

    return positions
