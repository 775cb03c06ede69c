"""The tide-generating potential of Moon and Sun at a place, and what a clock there feels of it.

Convention: the *time-variable part* is the tide minus the permanent tide. Time-averaged clock data
are mean-tide, so the permanent part stays in them and only the variable part is corrected for.
W counts as in W = W0 - C: a positive tide lowers the geopotential number.
"""

from __future__ import annotations

from dataclasses import dataclass

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from clockgeo.constants import GM_MOON, GM_SUN, Constant
from clockgeo.errors import DataError
from clockgeo.gravity.normal_field import cartesian
from clockgeo.gravity.places import Place
from clockgeo.gravity.tide_systems import permanent_tide_potential
from clockgeo.times import iso_utc, tai_from_iso, tt_julian_date, utc_julian_date

__all__ = [
    "LOVE_NUMBERS",
    "LoveNumbers",
    "SkyPositions",
    "TidalPotential",
    "permanent_tide_on_crust",
    "sky_positions",
    "tidal_potential",
    "tidal_potential_from",
]

_AU = erfa.DAU
_LAST_TAI_NS = tai_from_iso("2099-12-31T12:00:00Z")
_DEGREES = {"moon": (2, 3, 4), "sun": (2, 3)}
_GM: dict[str, Constant] = {"moon": GM_MOON, "sun": GM_SUN}


@dataclass(frozen=True)
class LoveNumbers:
    """Love numbers of one degree.

    Attributes
    ----------
    k, h : float
        Of the additional potential and of the radial displacement.
    source : str
        Where the values come from.
    """

    k: float
    h: float
    source: str

    @property
    def on_crust(self) -> float:
        """Factor 1 + k - h between the tide-generating potential and what a mark feels."""
        return 1.0 + self.k - self.h


LOVE_NUMBERS: dict[int, LoveNumbers] = {
    2: LoveNumbers(0.3019, 0.6078, "nominal values of the IERS Conventions 2010, ch. 6 and 7"),
    3: LoveNumbers(0.093, 0.292, "nominal values of the IERS Conventions 2010, ch. 6 and 7"),
    4: LoveNumbers(0.042, 0.176, "spherical Earth models, from memory; acts on 1.4e-3 m² s⁻²"),
}


@dataclass(frozen=True)
class SkyPositions:
    """Geocentric positions of Moon and Sun in the Earth-fixed frame.

    Attributes
    ----------
    moon, sun : array, shape (N, 3)
        m, rotating with the Earth (x through longitude 0, z through the pole).
    """

    moon: NDArray[np.float64]
    sun: NDArray[np.float64]


@dataclass(frozen=True)
class TidalPotential:
    """The tide at a place, body by body and degree by degree.

    Attributes
    ----------
    terms : dict
        ``("moon", 2)`` and so on -> tide-generating potential, m² s⁻², no Love numbers, permanent
        part included.
    permanent : float
        Permanent tide Wp at the place's latitude, m² s⁻², no Love number.
    """

    terms: dict[tuple[str, int], NDArray[np.float64]]
    permanent: float

    @property
    def generating(self) -> NDArray[np.float64]:
        """Sum of all terms: the tide-generating potential of rigid, oceanless space."""
        return np.asarray(sum(self.terms.values()))

    @property
    def on_crust(self) -> NDArray[np.float64]:
        """What a clock on the solid Earth feels, permanent part included: Σ (1 + k_n - h_n) W_n."""
        felt = (LOVE_NUMBERS[degree].on_crust * term for (_, degree), term in self.terms.items())
        return np.asarray(sum(felt))

    @property
    def permanent_on_crust(self) -> float:
        """The permanent part of `on_crust`: (1 + k2 - h2) Wp."""
        return LOVE_NUMBERS[2].on_crust * self.permanent

    @property
    def variable(self) -> NDArray[np.float64]:
        """Time-variable part of what a clock on the solid Earth feels; its long mean is zero."""
        return self.on_crust - self.permanent_on_crust


def sky_positions(tai_ns: ArrayLike, *, ut1_minus_utc: ArrayLike = 0.0) -> SkyPositions:
    """Where Moon and Sun stand over the rotating Earth.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds since 1958.
    ut1_minus_utc : float or array
        s; 0 costs at most 4e-4 m² s⁻² (4e-21), since |UT1 - UTC| < 0.9 s.

    Returns
    -------
    SkyPositions

    Raises
    ------
    DataError
        If an epoch is later than 2099, where the ephemeris of the Earth ends.

    Notes
    -----
    Analytic lunar theory (Meeus 1998, truncated ELP 2000) and Earth ephemeris as in ERFA `moon98`
    and `epv00`; precession, nutation IAU 2000B and Earth rotation angle; no polar motion. Against
    a numerical ephemeris the potential differs by at most 3.3e-4 m² s⁻² (3.7e-21).
    """
    epochs = np.atleast_1d(np.asarray(tai_ns, dtype=np.int64))
    if epochs.size and int(epochs.max()) > _LAST_TAI_NS:
        raise DataError(
            "the positions of Moon and Sun end with the year 2099",
            value=iso_utc(int(epochs.max())),
            allowed="Epochs from 1972 to 2099",
        )
    terrestrial = tt_julian_date(epochs)
    day, fraction = utc_julian_date(epochs)
    rotation = (day, fraction + np.asarray(ut1_minus_utc) / 86_400.0)
    to_earth = erfa.c2t00b(*terrestrial, *rotation, 0.0, 0.0)
    heliocentric, _ = erfa.epv00(*terrestrial)
    moon = erfa.moon98(*terrestrial)["p"] * _AU
    sun = -heliocentric["p"] * _AU
    return SkyPositions(*(np.einsum("nij,nj->ni", to_earth, body) for body in (moon, sun)))


def tidal_potential_from(sky: SkyPositions, place: Place) -> TidalPotential:
    """Tide at a place for given positions of Moon and Sun (see `tidal_potential`)."""
    site = cartesian(place.latitude, place.longitude, place.ellipsoidal_height)
    terms = {}
    for body, degrees in _DEGREES.items():
        for degree, term in _terms(getattr(sky, body), _GM[body].value, site, degrees):
            terms[body, degree] = term
    return TidalPotential(terms, float(permanent_tide_potential(place.latitude)))


def tidal_potential(
    tai_ns: ArrayLike, place: Place, *, ut1_minus_utc: ArrayLike = 0.0
) -> TidalPotential:
    """Tide of Moon (degrees 2 to 4) and Sun (2 and 3) at a place, every epoch evaluated.

    Parameters
    ----------
    tai_ns : int64 array, shape (N,)
        Epochs in TAI nanoseconds since 1958 (see `clockgeo.times`).
    place : Place
        Where the clock stands.
    ut1_minus_utc : float or array
        s.

    Returns
    -------
    TidalPotential
        Arrays of shape (N,) for each body and degree, and their sums.

    Notes
    -----
    W_n = (GM/d) (r/d)^n P_n(cos z) with the geocentric zenith angle z. Left out: higher degrees
    (below 3e-5 m² s⁻²), planets (1e-4 of the Sun's), the Earth's flattening in the response, the
    resonance of the liquid core near K1 (up to 6 % of that wave) and ocean tides, which enter as
    user tables (`clockgeo.gravity.loading`). For millions of epochs use `TideInterpolator`.
    """
    return tidal_potential_from(sky_positions(tai_ns, ut1_minus_utc=ut1_minus_utc), place)


def permanent_tide_on_crust(latitude: float) -> float:
    """Permanent part of the tide that a clock on the solid Earth feels, m² s⁻²: 0.694 Wp."""
    return LOVE_NUMBERS[2].on_crust * float(permanent_tide_potential(latitude))


def _terms(
    body: NDArray[np.float64], gm: float, site: NDArray[np.float64], degrees: tuple[int, ...]
) -> list[tuple[int, NDArray[np.float64]]]:
    r = float(np.linalg.norm(site))
    d = np.linalg.norm(body, axis=1)
    x = body @ site / (d * r)
    legendre = {
        2: lambda: (3 * x**2 - 1) / 2,
        3: lambda: (5 * x**2 - 3) * x / 2,
        4: lambda: ((35 * x**2 - 30) * x**2 + 3) / 8,
    }
    return [(n, gm / d * (r / d) ** n * legendre[n]()) for n in degrees]
