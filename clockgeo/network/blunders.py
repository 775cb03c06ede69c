"""Search for blunders: one by one, in pairs where two hide each other, and back again.

Data snooping (Baarda 1968) takes the largest standardised residual, allows that row a bias of its
own, and looks again. Two blunders can hide each other; so every suspect is tested anew beside the
others and cleared if it no longer stands out, and where the global test still fails, pairs of rows
are tested together (Kok 1984, On data snooping and multiple outlier testing, NOAA NOS NGS 30). Rows
that explain the misfit as well as the suspect are named with it.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from clockgeo.network.critical_values import critical_residual
from clockgeo.network.identifiability import listed
from clockgeo.network.reliability import Reliability

__all__ = ["BlunderSearch", "Suspect", "find_blunders"]

_ODDS = 6.0
"""Difference of χ² below which two explanations are not told apart: likelihoods within 1 : 20."""
_SEPARABLE = 1e-6
"""Share of its sharpness that a row must keep beside the suspects to be tested at all."""
_PAIR_ROWS = 1200
"""Rows whose pairs are tested; in larger nets those with the largest residuals."""
_TWINS = 10
"""Pairs of suspects for which other pairs are looked up."""
_GLOBAL_ALPHA = 0.001
_FAMILY_ALPHA = 0.05


@dataclass(frozen=True)
class Suspect:
    """A row that does not fit.

    Attributes
    ----------
    row : str
    bias, u_bias : float
        Its error as the other rows see it, observed minus true, and its u; m² s⁻².
    standardised : float
        bias over u_bias.
    alternatives : tuple of str
        Rows that would explain the misfit nearly as well.
    """

    row: str
    bias: float
    u_bias: float
    standardised: float
    alternatives: tuple[str, ...]


@dataclass(frozen=True)
class BlunderSearch:
    """What the search found.

    Attributes
    ----------
    suspects : tuple of Suspect
        In the order in which they were found.
    limit : float
        Critical value of a standardised residual.
    chi_squared, degrees_of_freedom : float, int
        Of the net once every suspect has a bias of its own.
    p_value : float or None
        Global test of the rest; None without degrees of freedom.
    text : str
        The verdict in words.
    """

    suspects: tuple[Suspect, ...]
    limit: float
    chi_squared: float
    degrees_of_freedom: int
    p_value: float | None
    text: str


class _State:
    """Residual statistics while some rows have a bias of their own."""

    def __init__(self, reliability: Reliability) -> None:
        self.base = reliability
        self.rows: list[int] = []
        self.columns = np.zeros((reliability.pull.size, 0))

    def choose(self, rows: list[int]) -> None:
        """Give exactly these rows a bias."""
        kept = [self.rows.index(row) for row in rows if row in self.rows]
        new = [row for row in rows if row not in self.rows]
        fresh = self.base.columns(np.array(new, dtype=np.int64)) if new else None
        parts = [self.columns[:, kept]] + ([fresh] if fresh is not None else [])
        self.rows = [row for row in rows if row in self.rows] + new
        self.columns = np.hstack(parts)

    @property
    def corner(self) -> NDArray[np.float64]:
        """M of the chosen rows."""
        return self.columns[self.rows]

    @property
    def biases(self) -> NDArray[np.float64]:
        """Estimated bias of every chosen row."""
        return np.asarray(np.linalg.solve(self.corner, self.base.pull[self.rows]))

    @property
    def u_biases(self) -> NDArray[np.float64]:
        """Standard uncertainties of the biases, each beside the others."""
        return np.sqrt(np.diag(np.linalg.inv(self.corner)))

    @property
    def explained(self) -> float:
        """χ² that the biases take away."""
        return float(self.base.pull[self.rows] @ self.biases) if self.rows else 0.0

    def residuals(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Standardised residuals of the other rows (0 where not testable), and their sharpness."""
        pull, sharpness = self.base.pull.copy(), self.base.sharpness.copy()
        if self.rows:
            share = np.linalg.solve(self.corner, self.columns.T)
            pull -= self.columns @ self.biases
            sharpness -= np.einsum("ni,in->n", self.columns, share)
        testable = sharpness > _SEPARABLE * np.maximum(self.base.sharpness, 1e-300)
        testable[self.rows] = False
        w = np.zeros(pull.size)
        w[testable] = pull[testable] / np.sqrt(sharpness[testable])
        return w, np.where(testable, sharpness, 0.0)


def find_blunders(
    reliability: Reliability, *, alpha: float | None = None, at_most: int | None = None
) -> BlunderSearch:
    """Search the observations of a net for blunders.

    Parameters
    ----------
    reliability : Reliability
        Residual statistics of the net with all rows.
    alpha : float, optional
        Size of the test of one row; that of the reliability if not given.
    at_most : int, optional
        Largest number of suspects; a third of the degrees of freedom if not given.

    Returns
    -------
    BlunderSearch
    """
    fit = reliability.adjustment.fit
    limit = critical_residual(reliability.alpha if alpha is None else alpha)
    most = at_most if at_most is not None else max(fit.degrees_of_freedom // 3, 1)
    state = _State(reliability)
    seen: set[frozenset[int]] = set()
    while len(state.rows) < most and fit.degrees_of_freedom > len(state.rows):
        chosen = _next_rows(state, limit, fit.chi_squared, fit.degrees_of_freedom)
        if not chosen:
            break
        state.choose([*state.rows, *chosen])
        _clear(state, limit)
        tried = frozenset(state.rows)
        if tried in seen:
            break
        seen.add(tried)
    return _result(state, limit)


def _next_rows(state: _State, limit: float, chi_squared: float, freedom: int) -> list[int]:
    """Return the row with the largest residual beyond the limit, else the best pair, else none."""
    w, sharpness = state.residuals()
    if not w.size:
        return []
    largest = int(np.argmax(np.abs(w)))
    if abs(w[largest]) > limit:
        return [largest]
    left = freedom - len(state.rows)
    if left < 2 or stats.chi2.sf(chi_squared - state.explained, left) > _GLOBAL_ALPHA:
        return []
    return _best_pair(state, w, sharpness)


def _best_pair(state: _State, w: NDArray[np.float64], sharpness: NDArray[np.float64]) -> list[int]:
    """Pair of rows that together explain most, if that is more than chance among all pairs."""
    rows, gain = _pair_gains(state, w, sharpness)
    if rows.size < 2:
        return []
    pairs = rows.size * (rows.size - 1) / 2.0
    first, second = np.unravel_index(int(np.argmax(gain)), gain.shape)
    if gain[first, second] <= stats.chi2.isf(_FAMILY_ALPHA / pairs, 2):
        return []
    return [int(rows[first]), int(rows[second])]


def _pair_gains(
    state: _State, w: NDArray[np.float64], sharpness: NDArray[np.float64]
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Rows whose pairs are tested, shape (m,), and χ² that each pair explains, shape (m, m)."""
    rows = np.flatnonzero(sharpness > 0.0)
    rows = rows[np.argsort(-np.abs(w[rows]), kind="stable")[:_PAIR_ROWS]]
    block = state.base.columns(rows)[rows]
    if state.rows:
        across = state.columns[rows]
        block = block - across @ np.linalg.solve(state.corner, across.T)
    root = np.sqrt(sharpness[rows])
    alike = block / np.outer(root, root)
    own = w[rows]
    apart = 1.0 - alike**2
    joint = own[:, None] ** 2 + own[None, :] ** 2 - 2.0 * alike * np.outer(own, own)
    gain = np.where(apart > 1e-4, joint / np.maximum(apart, 1e-4), 0.0)
    np.fill_diagonal(gain, 0.0)
    return rows, gain


def _clear(state: _State, limit: float) -> None:
    """Clear suspects, weakest first, that no longer stand out beside the others."""
    while len(state.rows) > 1:
        strength = np.abs(state.biases / state.u_biases)
        weakest = int(np.argmin(strength))
        if strength[weakest] > limit:
            return
        state.choose([row for row in state.rows if row != state.rows[weakest]])


def _alternatives(state: _State) -> dict[int, list[int]]:
    """Suspect -> rows that explain the misfit nearly as well, alone or in place of two suspects."""
    found: dict[int, set[int]] = {suspect: set() for suspect in state.rows}
    for suspect in state.rows:
        w, _ = _beside(state, [suspect]).residuals()
        near = np.flatnonzero((w[suspect] ** 2 - w**2 < _ODDS) & (w != 0.0))
        found[suspect].update(near.tolist())
    for first, second in list(combinations(state.rows, 2))[:_TWINS]:
        others = _beside(state, [first, second])
        rows, gain = _pair_gains(others, *others.residuals())
        place = {int(row): i for i, row in enumerate(rows)}
        if first not in place or second not in place:
            continue
        near = gain > gain[place[first], place[second]] - _ODDS
        # A pair with one of the suspects in it is another reading of the other one only.
        near[[place[first], place[second]], :] = False
        near[:, [place[first], place[second]]] = False
        instead = set(rows[np.unique(np.argwhere(near))].tolist())
        found[first] |= instead
        found[second] |= instead
    return {one: sorted(rows.difference(state.rows)) for one, rows in found.items()}


def _beside(state: _State, left_out: list[int]) -> _State:
    """State in which some suspects have no bias of their own."""
    others = _State(state.base)
    others.rows = [row for row in state.rows if row not in left_out]
    others.columns = state.columns[:, [state.rows.index(row) for row in others.rows]]
    return others


def _result(state: _State, limit: float) -> BlunderSearch:
    adjustment = state.base.adjustment
    names = adjustment.model.rows
    also = _alternatives(state)
    suspects = tuple(
        Suspect(
            row=names[row],
            bias=float(bias),
            u_bias=float(u),
            standardised=float(bias / u),
            alternatives=tuple(names[other] for other in also[row]),
        )
        for row, bias, u in (
            zip(state.rows, state.biases, state.u_biases, strict=True) if state.rows else ()
        )
    )
    left = adjustment.fit.degrees_of_freedom - len(suspects)
    chi_squared = max(adjustment.fit.chi_squared - state.explained, 0.0)
    p_value = float(stats.chi2.sf(chi_squared, left)) if left > 0 else None
    return BlunderSearch(
        suspects=suspects,
        limit=limit,
        chi_squared=chi_squared,
        degrees_of_freedom=left,
        p_value=p_value,
        text=_verdict(suspects, p_value),
    )


def _verdict(suspects: tuple[Suspect, ...], p_value: float | None) -> str:
    rest = ""
    if p_value is not None and p_value < _GLOBAL_ALPHA:
        rest = (
            "; the global test still fails without any single row or pair standing out: "
            "the stated uncertainties are too small, or many small errors add up"
        )
    if not suspects:
        return f"no observation stands out{rest}"
    described = []
    for one in suspects:
        also = f", not told apart from {listed(one.alternatives)}" if one.alternatives else ""
        described.append(f"{one.row} (off by {one.bias:+.3f} m2 s-2{also})")
    return f"suspected: {'; '.join(described)}{rest}"
