"""Physical and conventional constants: value, unit, standard uncertainty and source.

A constant without a source cannot be made. Values are SI. `L_G`, and with it the zero level of the
time scale, is a defining constant and therefore exact.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = [
    "DOODSON_GRAVITY",
    "EARTH_ROTATION_RATE",
    "GM_MOON",
    "GM_SUN",
    "GRAVITATIONAL_CONSTANT",
    "L_G",
    "ROCK_DENSITY",
    "SPEED_OF_LIGHT",
    "SPEED_OF_LIGHT_SQUARED",
    "STANDARD_GRAVITY",
    "W0_HEIGHT_REFERENCE",
    "W0_TIME_SCALE",
    "Constant",
]


@dataclass(frozen=True)
class Constant:
    """A number with everything needed to trust it.

    Attributes
    ----------
    symbol : str
        The symbol used in formulas.
    value : float
        Value in `unit`.
    unit : str
        SI unit; `"1"` for dimensionless numbers.
    u : float
        Standard uncertainty in `unit`; 0 for exact constants.
    source : str
        Where the value is defined or published; must not be empty.

    Raises
    ------
    ValueError
        If `source` is empty or `u` is negative.
    """

    symbol: str
    value: float
    unit: str
    u: float
    source: str

    def __post_init__(self) -> None:
        if not self.source.strip():
            message = f"constant {self.symbol} has no source; give the paper or standard"
            raise ValueError(message)
        if not self.u >= 0.0:
            message = f"constant {self.symbol} has u = {self.u}; it must not be negative"
            raise ValueError(message)

    def __float__(self) -> float:
        return self.value


SPEED_OF_LIGHT = Constant("c", 299_792_458.0, "m s-1", 0.0, "SI Brochure, 9th edition, section 2.2")
SPEED_OF_LIGHT_SQUARED = Constant(
    "c^2", SPEED_OF_LIGHT.value**2, "m2 s-2", 0.0, "square of the exact speed of light"
)
L_G = Constant("L_G", 6.969290134e-10, "1", 0.0, "IAU 2000 Resolution B1.9 (defining constant)")
W0_TIME_SCALE = Constant(
    "W0(TT)",
    L_G.value * SPEED_OF_LIGHT_SQUARED.value,
    "m2 s-2",
    0.0,
    "L_G c^2, IAU 2000 Resolution B1.9; 62 636 856.000 519 m2 s-2",
)
W0_HEIGHT_REFERENCE = Constant(
    "W0(IHRS)", 62_636_853.4, "m2 s-2", 0.0, "IAG Resolution 1 (2015); Sanchez et al. 2016"
)
GM_MOON = Constant("GM_Moon", 4.902800066e12, "m3 s-2", 1e5, "JPL DE421 planetary constants")
GM_SUN = Constant("GM_Sun", 1.32712440018e20, "m3 s-2", 1e10, "IAU 2009 astronomical constants")
EARTH_ROTATION_RATE = Constant(
    "omega", 7.292115e-5, "rad s-1", 0.0, "Moritz 1980, Geodetic Reference System 1980"
)
GRAVITATIONAL_CONSTANT = Constant("G", 6.67430e-11, "m3 kg-1 s-2", 1.5e-15, "CODATA 2018")
ROCK_DENSITY = Constant(
    "rho", 2670.0, "kg m-3", 100.0, "conventional crustal density of gravity reductions"
)
STANDARD_GRAVITY = Constant("g_n", 9.80665, "m s-2", 0.0, "3rd CGPM (1901)")
DOODSON_GRAVITY = Constant(
    "g_CTE", 9.79828685, "m s-2", 0.0, "Cartwright and Edden 1973, normalisation of tide amplitudes"
)
