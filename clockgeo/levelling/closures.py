"""Closed loops of clock sessions: what must add up to zero, and whether it does.

A session joins two ends, each a clock at a site; around a loop numbers and nominal-ratio errors
cancel. A loop whose sum has no variance beyond that of the loops before it is an identity, made of
the same data, and checks nothing.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import SessionMean

__all__ = ["Closure", "closures_of", "signed_names"]

_NOTHING = 1e-9
"""Share of the variances of its sessions below which what a loop adds counts as none."""

End = tuple[str, str]


@dataclass(frozen=True)
class Closure:
    """A closed loop of sessions.

    Attributes
    ----------
    sessions : tuple of str
    signs : tuple of int
        +1 where a session is run from denominator to numerator, -1 against.
    misclosure, u : float
        Signed sum and its standard uncertainty with all shared effects, m² s⁻².
    identity : bool
        Whether its sum is fixed by its own sessions or by the loops before it: together they have
        fewer independent sums than loops.
    """

    sessions: tuple[str, ...]
    signs: tuple[int, ...]
    misclosure: float
    u: float
    identity: bool

    @property
    def normalised(self) -> float | None:
        """Misclosure over its u; None for an identity."""
        return None if self.identity else self.misclosure / self.u


def signed_names(names: Sequence[str], signs: Sequence[int]) -> str:
    """Write a signed sum of named things, such as a loop of sessions.

    >>> signed_names(["there", "back"], [1, -1])
    '+there −back'
    """
    return " ".join(
        f"{'+' if sign > 0 else '−'}{name}" for name, sign in zip(names, signs, strict=True)
    )


def closures_of(means: Sequence[SessionMean], model: LinearModel) -> list[Closure]:
    """Independent loops of the sessions, one for each session beyond those that join all ends.

    Parameters
    ----------
    means : sequence of SessionMean
    model : LinearModel
        With a row for each session, named by its id.
    """
    place = {row: i for i, row in enumerate(model.rows)}
    edges = {
        mean.id: (
            (mean.denominator_site.id, mean.denominator.id),
            (mean.numerator_site.id, mean.numerator.id),
        )
        for mean in means
        if mean.id in place
    }
    tree: dict[str, tuple[End, End]] = {}
    loops = []
    for session, (start, stop) in edges.items():
        path = _path(tree, stop, start)
        if path is None:
            tree[session] = (start, stop)
        else:
            loops.append([(session, 1), *path])
    return _closed(model, place, loops)


def _path(tree: dict[str, tuple[End, End]], start: End, goal: End) -> list[tuple[str, int]] | None:
    """Sessions from one end to another, with the sign they are run in; None if there is no way."""
    came: dict[End, tuple[End, str, int] | None] = {start: None}
    queue = deque([start])
    while queue:
        here = queue.popleft()
        for session, (low, high) in tree.items():
            for one, other, sign in ((low, high, 1), (high, low, -1)):
                if one == here and other not in came:
                    came[other] = (here, session, sign)
                    queue.append(other)
    if goal not in came:
        return None
    path = []
    step = came[goal]
    while step is not None:
        path.append((step[1], step[2]))
        step = came[step[0]]
    return path[::-1]


def _closed(
    model: LinearModel, place: dict[str, int], loops: Sequence[Sequence[tuple[str, int]]]
) -> list[Closure]:
    signs = np.zeros((len(loops), len(model.rows)))
    for number, loop in enumerate(loops):
        for session, sign in loop:
            signs[number, place[session]] = sign
    loads = np.asarray(signs @ model.loading.toarray())
    covariance = np.asarray(signs @ (model.noise @ signs.T)) + loads @ loads.T
    single = model.noise.diagonal() + model.loading.multiply(model.loading).sum(axis=1)
    whole = np.abs(signs) @ np.asarray(single).ravel()
    return [
        Closure(
            sessions=tuple(session for session, _ in loop),
            signs=tuple(sign for _, sign in loop),
            misclosure=float(signs[number] @ model.values),
            u=float(np.sqrt(max(covariance[number, number], 0.0))),
            identity=_added(covariance, number) <= _NOTHING * whole[number],
        )
        for number, loop in enumerate(loops)
    ]


def _added(covariance: NDArray[np.float64], number: int) -> float:
    """Variance of one loop's sum that the loops before it do not explain."""
    before = covariance[:number, :number]
    across = covariance[:number, number]
    scale = max(float(np.max(np.diag(before), initial=0.0)), 1e-300)
    explained = across @ np.linalg.pinv(before / scale, hermitian=True) @ across / scale
    return float(covariance[number, number] - explained)
