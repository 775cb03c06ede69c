"""Closed loops of clock sessions: what must add up to zero, and whether it does.

A session joins two ends, each a clock at a site; around a loop numbers and nominal-ratio errors
cancel. A loop whose sum has no variance is an identity, made of the same data, and checks nothing.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import SessionMean

__all__ = ["Closure", "closures_of"]

_NOTHING = 1e-9
"""Share of the variances of its sessions below which a loop's own counts as none."""

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
        Whether the loop closes by construction.
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
    found = []
    for session, (start, stop) in edges.items():
        path = _path(tree, stop, start)
        if path is None:
            tree[session] = (start, stop)
        else:
            found.append(_closed(model, place, [(session, 1), *path]))
    return found


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


def _closed(model: LinearModel, place: dict[str, int], path: list[tuple[str, int]]) -> Closure:
    rows = [place[session] for session, _ in path]
    signs = np.array([sign for _, sign in path], dtype=np.float64)
    noise = model.noise[rows][:, rows]
    loads = model.loading[rows]
    variance = float(signs @ (noise @ signs)) + float(np.sum((loads.T @ signs) ** 2))
    whole = float(noise.diagonal().sum() + loads.multiply(loads).sum())
    return Closure(
        sessions=tuple(session for session, _ in path),
        signs=tuple(sign for _, sign in path),
        misclosure=float(signs @ model.values[rows]),
        u=float(np.sqrt(max(variance, 0.0))),
        identity=variance <= _NOTHING * whole,
    )
