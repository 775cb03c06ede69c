"""Two published data sets of the stability literature and the deviations printed for them.

Nine average frequencies: B. E. Blair (ed.) 1974, NBS Monograph 140, Annex 8.E, reprinted in W. J.
Riley and D. A. Howe 2008, NIST SP 1065, test suite. A thousand points of the multiplicative
congruential generator 16807 n mod 2147483647 from 1234567890: ibid. Sets and tables are recalled
from memory; every value was recomputed from the definitions with plain NumPy, to the digits below.
"""

from __future__ import annotations

import numpy as np

NINE = np.array([892.0, 809.0, 823.0, 798.0, 671.0, 644.0, 883.0, 903.0, 677.0])


def thousand():
    """The thousand numbers, the seed being the first."""
    n, values = 1_234_567_890, []
    for _ in range(1_000):
        values.append(n / 2_147_483_647)
        n = 16_807 * n % 2_147_483_647
    return np.array(values)


# Statistic -> printed values at the averaging factors 1 and 2; the total family with the factors
# for white FM that the tables contain.
OF_NINE = {
    "allan": ("91.22945", "115.8082"),
    "overlapping-allan": ("91.22945", "85.95287"),
    "modified-allan": ("91.22945", "74.78849"),
    "time": ("52.67135", "86.35831"),
    "hadamard": ("70.80607", "116.7980"),
    "overlapping-hadamard": ("70.80607", "85.61487"),
    "hadamard-total": ("70.80607", "91.16396"),
    "total": ("91.22945", "93.90379"),
    "modified-total": ("75.50203", "75.83607"),
    "time-total": ("43.59112", "87.56795"),
}

# Printed at the averaging factors 1, 10 and 100.
OF_THOUSAND = {
    "allan": ("2.922319e-01", "9.965736e-02", "3.897804e-02"),
    "overlapping-allan": ("2.922319e-01", "9.159953e-02", "3.241343e-02"),
    "modified-allan": ("2.922319e-01", "6.172376e-02", "2.170921e-02"),
    "time": ("1.687202e-01", "3.563623e-01", "1.253382e+00"),
    "hadamard": ("2.943883e-01", "1.052754e-01", "3.910861e-02"),
    "overlapping-hadamard": ("2.943883e-01", "9.581083e-02", "3.237638e-02"),
    "hadamard-total": ("2.943883e-01", "9.614788e-02", "3.058103e-02"),
    "total": ("2.922319e-01", "9.134743e-02", "3.406530e-02"),
    "modified-total": ("2.418528e-01", "6.499161e-02", "2.287774e-02"),
    "time-total": ("1.396338e-01", "3.752293e-01", "1.320847e+00"),
}

# The same, recomputed to more digits from the definitions in plain NumPy.
RECOMPUTED_THOUSAND = {
    "allan": (2.9223187811e-1, 9.9657360632e-2, 3.8978043308e-2),
    "overlapping-allan": (2.9223187811e-1, 9.1599534201e-2, 3.2413430261e-2),
    "modified-allan": (2.9223187811e-1, 6.1723763825e-2, 2.1709209137e-2),
    "time": (1.6872015349e-1, 3.5636231659e-1, 1.2533817739),
    "hadamard": (2.9438832912e-1, 1.0527541940e-1, 3.9108605597e-2),
    "overlapping-hadamard": (2.9438832912e-1, 9.5810831733e-2, 3.2376382528e-2),
    "hadamard-total": (2.9438832912e-1, 9.6147875009e-2, 3.0581027185e-2),
    "total": (2.9223187811e-1, 9.1347432617e-2, 3.4065302522e-2),
    "modified-total": (2.4185282316e-1, 6.4991614498e-2, 2.2877741953e-2),
    "time-total": (1.3963379256e-1, 3.7522926126e-1, 1.3208470475),
}
