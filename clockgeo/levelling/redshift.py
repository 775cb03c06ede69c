"""The one place of the sign rule: fractional frequency, potential difference, height of a clock.

y = (f_n/f_d) / (f_n/f_d)_nominal - 1 is positive when the numerator clock is higher, because the
higher clock ticks faster. With geopotential numbers C = W0 - W, which grow with height,

    y = (C_n - C_d) / c^2.

The next order in 1/c^2 is relatively W/c^2 = 7e-10 (below 1e-22 for 1 km) and is left out.
Source: Denker et al. 2018, J. Geod. 92:487, equations of section 2; sign as in the campaign model.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from clockgeo.constants import SPEED_OF_LIGHT_SQUARED

__all__ = ["potential_from_shift", "shift_from_potential"]

Number = TypeVar("Number", float, NDArray[np.float64])


def potential_from_shift(shift: Number) -> Number:
    """Geopotential difference C_n - C_d in m² s⁻² that a fractional frequency `shift` stands for.

    Parameters
    ----------
    shift : float or array
        Fractional frequency y, or its standard uncertainty; dimensionless.

    Returns
    -------
    float or array
        c² y in m² s⁻², numerator minus denominator; positive: the numerator clock is higher.

    Examples
    --------
    >>> round(potential_from_shift(1e-18), 7)
    0.0898755
    """
    return shift * SPEED_OF_LIGHT_SQUARED.value


def shift_from_potential(difference: Number) -> Number:
    """Fractional frequency y = (C_n - C_d)/c² of a geopotential `difference` in m² s⁻²."""
    return difference / SPEED_OF_LIGHT_SQUARED.value
