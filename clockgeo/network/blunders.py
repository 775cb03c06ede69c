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
_PAIR_WORK = 1e7
"""Rows of the net times rows whose pairs are tested, at most."""
_PART = 100
"""Columns that are made at a time."""
_KIN, _ALIKE, _AT_ALL = 150, 0.1, 0.02
"""Most rows that may explain what suspects do, their least correlation with some suspect, and
with the one that they are named with."""
_HELD = 2e8
"""Numbers that the columns of all suspects may hold."""
_EACH = 4.0
"""χ² that each row of a pair must explain beside the other, to stand for one suspect."""
_OTHER_PAIRS = 5000
"""Pairs that are looked at in place of two suspects, best first."""
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
        Largest number of suspects; a third of the degrees of freedom if not given, and no more
        than memory allows: 100 in a net of two million rows.

    Returns
    -------
    BlunderSearch
    """
    fit = reliability.adjustment.fit
    limit = critical_residual(reliability.alpha if alpha is None else alpha)
    most = at_most if at_most is not None else max(fit.degrees_of_freedom // 3, 1)
    most = min(most, max(int(_HELD // max(reliability.pull.size, 1)), 10))
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


@dataclass(frozen=True, eq=False)
class _Pairs:
    """Pairs among m rows: standardised residuals w, their correlations, χ² that each explains."""

    rows: NDArray[np.int64]
    w: NDArray[np.float64]
    alike: NDArray[np.float64]
    gain: NDArray[np.float64]


def _best_pair(state: _State, w: NDArray[np.float64], sharpness: NDArray[np.float64]) -> list[int]:
    """Pair of rows that together explain most, if that is more than chance among all pairs."""
    testable = np.flatnonzero(sharpness > 0.0)
    if testable.size < 2:
        return []
    most = int(min(_PAIR_ROWS, max(_PAIR_WORK / w.size, 50.0)))
    chosen = testable[np.argsort(-np.abs(w[testable]), kind="stable")[:most]]
    found = _pair_gains(state, w, sharpness, chosen)
    chances = testable.size * (testable.size - 1) / 2.0
    first, second = np.unravel_index(int(np.argmax(found.gain)), found.gain.shape)
    if found.gain[first, second] <= stats.chi2.isf(_FAMILY_ALPHA / chances, 2):
        return []
    return [int(found.rows[first]), int(found.rows[second])]


def _pair_gains(
    state: _State,
    w: NDArray[np.float64],
    sharpness: NDArray[np.float64],
    rows: NDArray[np.int64],
) -> _Pairs:
    """All pairs of some testable rows."""
    parts = [rows[start : start + _PART] for start in range(0, rows.size, _PART)]
    block = np.hstack([state.base.columns(part)[rows] for part in parts])
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
    return _Pairs(rows, own, alike, gain)


def _clear(state: _State, limit: float) -> None:
    """Clear suspects, weakest first, that no longer stand out beside the others."""
    while len(state.rows) > 1:
        strength = np.abs(state.biases / state.u_biases)
        weakest = int(np.argmin(strength))
        if strength[weakest] > limit:
            return
        state.choose([row for row in state.rows if row != state.rows[weakest]])


def _alternatives(state: _State, limit: float) -> dict[int, list[int]]:
    """Suspect -> rows that explain the same misfit nearly as well, alone or as a pair.

    They do so only if the suspects no longer stand out once these rows have biases instead.
    """
    found: dict[int, set[int]] = {suspect: set() for suspect in state.rows}
    for suspect in state.rows:
        others = _beside(state, [suspect])
        w, sharpness = others.residuals()
        alike = _alike(others, state.columns[:, state.rows.index(suspect)], suspect, sharpness)
        near = (w[suspect] ** 2 - w**2 < _ODDS) & (sharpness > 0.0)
        left = np.abs(w[suspect] - alike * w) <= limit * np.sqrt(np.maximum(1.0 - alike**2, 1e-12))
        found[suspect].update(np.flatnonzero(near & left).tolist())
    sets = [[one] for one in state.rows] + [list(two) for two in combinations(state.rows, 2)]
    for suspects in sets[: len(state.rows) + _TWINS]:
        for suspect, instead in _other_pairs(state, suspects).items():
            found[suspect] |= instead
    return {one: sorted(rows.difference(state.rows)) for one, rows in found.items()}


def _alike(
    state: _State, column: NDArray[np.float64], row: int, sharpness: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Correlation of the standardised residual of a row, whose column of M is given, with all."""
    if state.rows:
        column = column - state.columns @ np.linalg.solve(state.corner, column[state.rows])
    root = np.sqrt(np.maximum(sharpness * sharpness[row], 1e-300))
    return np.where(sharpness > 0.0, np.clip(column / root, -1.0, 1.0), 0.0)


def _other_pairs(state: _State, suspects: list[int]) -> dict[int, set[int]]:
    """Rows of pairs that explain the misfit of one or two suspects about as well as these do.

    In place of one suspect, which is simpler, a pair must explain more, with each of its rows.
    """
    others, count = _beside(state, suspects), len(suspects)
    w, sharpness = others.residuals()
    columns = [state.columns[:, state.rows.index(one)] for one in suspects]
    near = np.array(
        [
            np.abs(_alike(others, column, one, sharpness))
            for one, column in zip(suspects, columns, strict=True)
        ]
    )
    kin = near.max(axis=0)
    kin[suspects] = 2.0
    rows = np.argsort(-kin, kind="stable")[:_KIN]
    pairs = _pair_gains(others, w, sharpness, rows[kin[rows] > _ALIKE])
    if count == 1:
        stronger = np.maximum(*np.meshgrid(pairs.w**2, pairs.w**2))
        good = (pairs.gain > pairs.w[0] ** 2) & (pairs.gain - stronger > _EACH)
    else:
        good = pairs.gain > pairs.gain[0, 1] - _ODDS
    # A pair with one of the suspects in it is another reading of the other one only.
    good[:count, :] = False
    good[:, :count] = False
    i, j = np.nonzero(np.triu(good, 1))
    best = np.argsort(-pairs.gain[i, j], kind="stable")[:_OTHER_PAIRS]
    i, j = i[best], j[best]
    every = np.column_stack([*(np.full_like(i, place) for place in range(count)), i, j])
    alike = pairs.alike[every[:, :, None], every[:, None, :]]
    own = pairs.w[every]
    together = np.einsum("mi,mij,mj->m", own, np.linalg.pinv(alike, 1e-6, hermitian=True), own)
    same = together - pairs.gain[i, j] <= stats.chi2.isf(_GLOBAL_ALPHA, count)
    instead = pairs.rows[np.unique(np.concatenate([i[same], j[same]]))]
    return {
        one: set(instead[own_near[instead] > _AT_ALL].tolist())
        for one, own_near in zip(suspects, near, strict=True)
    }


def _beside(state: _State, left_out: list[int]) -> _State:
    """State in which some suspects have no bias of their own."""
    others = _State(state.base)
    others.rows = [row for row in state.rows if row not in left_out]
    others.columns = state.columns[:, [state.rows.index(row) for row in others.rows]]
    return others


def _result(state: _State, limit: float) -> BlunderSearch:
    adjustment = state.base.adjustment
    names = adjustment.model.rows
    also = _alternatives(state, limit)
    w, _ = state.residuals()
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
        text=_verdict(suspects, p_value, more=int(np.count_nonzero(np.abs(w) > limit))),
    )


def _verdict(suspects: tuple[Suspect, ...], p_value: float | None, *, more: int) -> str:
    rest = ""
    if more:
        rest = f"; the search ended here, though {more} more stand out"
    elif p_value is not None and p_value < _GLOBAL_ALPHA:
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
