"""How well each observation is controlled by the others, and what its errors would do.

With P = V⁻¹ the weights, v the residuals and M = P Q_v P, observation i has

    standardised residual     w_i = (P v)_i / √M_ii            ~ (0, 1),
    redundancy number         r_i = (Q_v P)_ii                 Σ r_i = degrees of freedom,
    minimal detectable bias   ∇_i = δ0 / √M_ii                 = σ_i δ0 / √r_i without correlation,
    external reliability      δ_i = δ0 √((P_ii - M_ii) / M_ii).

Baarda 1968 (A testing procedure for use in geodetic networks, Netherlands Geodetic Commission);
δ0 is the shift that a test of size α finds with the stated power. An observation that nothing else
checks has M_ii = 0: no residual can show its error, and its minimal detectable bias is infinite.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from clockgeo.network.adjustment import Adjustment
from clockgeo.network.critical_values import detectable_shift
from clockgeo.network.whitening import WhitenedSystem

__all__ = ["Reliability", "reliability_of"]

_UNCONTROLLED = 1e-7
"""Share of its own variance below which a row's control counts as none."""


@dataclass(frozen=True, eq=False)
class Reliability:
    """Residuals of an adjustment and their control (see the module's head).

    Attributes
    ----------
    adjustment : Adjustment
    pull : float array, shape (n,)
        P v in m⁻² s².
    sharpness : float array, shape (n,)
        M_ii in m⁻⁴ s⁴; 0 where nothing controls the row.
    redundancy : float array, shape (n,)
        Redundancy numbers; rows that fix an unknown have 0.
    alpha, power : float
        Size and power of the test that the minimal detectable bias refers to.
    """

    adjustment: Adjustment
    pull: NDArray[np.float64]
    sharpness: NDArray[np.float64]
    redundancy: NDArray[np.float64]
    alpha: float
    power: float

    @property
    def controlled(self) -> NDArray[np.bool_]:
        """Whether an error of the row could show in any residual."""
        return self.sharpness > 0.0

    @cached_property
    def standardised(self) -> NDArray[np.float64]:
        """Standardised residuals w; NaN where the row is not controlled."""
        return self._per_root(self.pull, np.nan)

    @cached_property
    def minimal_detectable_bias(self) -> NDArray[np.float64]:
        """Smallest error found with the stated power, m² s⁻²; infinite if not controlled."""
        shift = detectable_shift(alpha=self.alpha, power=self.power)
        return self._per_root(np.full(self.pull.size, shift), np.inf)

    def _per_root(self, values: NDArray[np.float64], otherwise: float) -> NDArray[np.float64]:
        found = np.full(values.size, otherwise)
        here = self.controlled
        found[here] = values[here] / np.sqrt(self.sharpness[here])
        return found

    def columns(self, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        """Columns of M for some rows, shape (n, m): M e = P e - P A Q Aᵀ P e."""
        system = self.adjustment.system
        chosen = system.whitener[:, rows].toarray()
        seen = system.design[: chosen.shape[0]]
        projected = seen @ self.adjustment.normals.solve(seen.T @ chosen)
        return np.asarray(system.whitener.T @ (chosen - projected))

    def effect_of_bias(
        self, rows: NDArray[np.int64], bias: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """What an error in each of some rows does to the unknowns, shape (p, m).

        Parameters
        ----------
        rows : int array, shape (m,)
        bias : float array, shape (m,)
            Error of each row in m² s⁻²; the rows are taken one at a time.
        """
        system, zero = self.adjustment.system, self.adjustment.zero
        seen = system.design[: system.whitener.shape[0]]
        pushed = self.adjustment.normals.solve(seen.T @ system.whitener[:, rows].toarray())
        effect = np.zeros((system.known.size, rows.size))
        effect[system.free] = pushed[: system.free.size] * bias
        if zero.direction is not None and zero.mean_of is not None:
            effect -= np.outer(zero.direction, zero.mean_of @ effect)
        return effect


def reliability_of(
    adjustment: Adjustment, *, alpha: float = 0.001, power: float = 0.80
) -> Reliability:
    """Residual statistics of every observation.

    Parameters
    ----------
    adjustment : Adjustment
    alpha, power : float
        Size of the test of one observation, and its power at the minimal detectable bias.

    Returns
    -------
    Reliability
    """
    system = adjustment.system
    size = len(adjustment.model.rows)
    misfit = system.whitener @ adjustment.residuals
    misfit[system.exact] = 0.0
    sharpness, redundancy = np.zeros(size), np.zeros(size)
    joint = np.concatenate(system.blocks) if system.blocks else np.zeros(0, dtype=np.int64)
    single = np.setdiff1d(np.arange(size), np.concatenate([system.exact, joint]))
    _single_rows(adjustment, single, sharpness, redundancy)
    for block in system.blocks:
        _block(adjustment, block, sharpness, redundancy)
    loading = adjustment.model.loading
    variance = adjustment.model.noise.diagonal() + np.asarray(
        loading.multiply(loading).sum(axis=1)
    ).ravel().astype(np.float64)
    uncontrolled = sharpness * variance < _UNCONTROLLED
    sharpness[uncontrolled] = 0.0
    pull = np.asarray(system.whitener.T @ misfit)
    return Reliability(adjustment, pull, sharpness, redundancy, alpha, power)


def _single_rows(
    adjustment: Adjustment,
    rows: NDArray[np.int64],
    sharpness: NDArray[np.float64],
    redundancy: NDArray[np.float64],
) -> None:
    """Rows with noise of their own: bᵀQb from the few covariances each row needs."""
    system = adjustment.system
    design, free = system.design, system.free.size
    weight = system.whitener.diagonal()
    number = np.diff(design.indptr)[: weight.size]
    for count in np.unique(number[rows]):
        these = rows[number[rows] == count]
        entries = design.indptr[these][:, None] + np.arange(count)
        places, values = design.indices[entries], design.data[entries]
        first, second = np.broadcast_arrays(places[:, :, None], places[:, None, :])
        covariance = adjustment.normals.at(first.ravel(), second.ravel()).reshape(first.shape)
        parts = values * np.einsum("rab,rb->ra", covariance, values)
        sharpness[these] = weight[these] ** 2 * (1.0 - parts.sum(axis=1))
        redundancy[these] = 1.0 - np.where(places < free, parts, 0.0).sum(axis=1)


def _block(
    adjustment: Adjustment,
    rows: NDArray[np.int64],
    sharpness: NDArray[np.float64],
    redundancy: NDArray[np.float64],
) -> None:
    """Rows that share their noise, by dense algebra of the block."""
    system = adjustment.system
    whitener = system.whitener[rows][:, rows].toarray()
    part = system.design[rows]
    places = np.unique(part.indices)
    values = part[:, places].toarray()
    first, second = np.meshgrid(places, places, indexing="ij")
    covariance = adjustment.normals.at(first.ravel(), second.ravel()).reshape(first.shape)
    spread = values @ covariance
    inner = np.eye(rows.size) - spread @ values.T
    sharpness[rows] = np.einsum("ki,kl,li->i", whitener, inner, whitener)
    plain = _without_whitening(system, rows, places)
    plain[:, places >= system.free.size] = 0.0
    redundancy[rows] = 1.0 - np.einsum("ia,ka,ki->i", plain, spread, whitener)


def _without_whitening(
    system: WhitenedSystem, rows: NDArray[np.int64], places: NDArray[np.int32]
) -> NDArray[np.float64]:
    """Coefficients of the free unknowns among `places` in the rows as observed."""
    unknowns = places < system.free.size
    found = np.zeros((rows.size, places.size))
    columns = system.free[places[unknowns]]
    found[:, unknowns] = system.model.design[rows][:, columns].toarray()
    return found
