"""What the zero level of a network hangs on: known numbers, the mean of sites, or nothing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from clockgeo.errors import DataError
from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.identifiability import Identifiability, listed
from clockgeo.network.normal_equations import NormalEquations
from clockgeo.network.whitening import WhitenedSystem

__all__ = ["ZeroDefinition", "ZeroRule", "define_zero"]


@dataclass(frozen=True)
class ZeroRule:
    """How the zero level is set where no observation does.

    Attributes
    ----------
    sites : tuple of str or None
        Sites whose mean number is held: one for a fixed site, several for their mean, None for
        all points (inner constraints: the covariance of the numbers has the smallest trace).
    mean : float
        The value of that mean in m² s⁻².
    """

    sites: tuple[str, ...] | None = None
    mean: float = 0.0


@dataclass(frozen=True, eq=False)
class ZeroDefinition:
    """The zero level as it was set, and the S-transformation x → x - D (bᵀx - m) that sets it.

    Attributes
    ----------
    text : str
        What the zero level hangs on, in words.
    solution : float array, shape (p,)
        Unknowns after the transformation; where not estimable, with one unknown a direction held.
    open_unknowns : bool array, shape (p,)
        Unknowns without a value.
    direction, mean_of : float arrays, shape (p,), or None
        D with bᵀD = 1, and b.
    cross : float array, shape (p,) or None
        Q b.
    remaining : sparse array, shape (p, k)
        Directions that stay open.
    """

    text: str
    solution: NDArray[np.float64]
    open_unknowns: NDArray[np.bool_]
    remaining: sparse.csc_array
    direction: NDArray[np.float64] | None = None
    mean_of: NDArray[np.float64] | None = None
    cross: NDArray[np.float64] | None = None

    def pull_back(self, weights: NDArray[np.float64]) -> NDArray[np.float64]:
        """Sᵀ w: the combination of held unknowns that a combination of the results is."""
        if self.direction is None or self.mean_of is None:
            return weights
        return weights - self.mean_of * float(self.direction @ weights)

    def diagonal(self, variance: NDArray[np.float64]) -> NDArray[np.float64]:
        """Diagonal of S Q Sᵀ from that of Q."""
        if self.direction is None or self.mean_of is None or self.cross is None:
            return variance
        spread = float(self.mean_of @ self.cross)
        return np.asarray(variance - 2.0 * self.direction * self.cross + self.direction**2 * spread)

    def sees(self, weights: NDArray[np.float64]) -> bool:
        """Whether a combination has no part in the directions that stay open."""
        if not self.remaining.shape[1]:
            return True
        part = np.abs(self.remaining.T @ weights)
        size = abs(self.remaining).T @ np.abs(weights)
        return bool(np.all(part <= 1e-9 * np.maximum(size, 1e-300)))


def define_zero(
    model: LinearModel,
    known: Identifiability,
    rule: ZeroRule | None,
    estimate: NDArray[np.float64],
    system: WhitenedSystem,
    normals: NormalEquations,
) -> ZeroDefinition:
    """Move a solution with held unknowns to the zero level that the `rule` asks for.

    Raises
    ------
    DataError
        If the rule names a site that is not there, or the observations set the zero level already.
    """
    directions = known.null_space.directions
    if rule is None:
        fixed = [row for row, kind in zip(model.rows, model.kinds, strict=True) if kind == "known"]
        text = listed(fixed) if fixed else "the observations as they are"
        return ZeroDefinition(text, estimate, known.null_space.undetermined, directions)
    mean_of, text = _mean_of(model, rule)
    seen = directions.T @ mean_of
    if not np.any(np.abs(seen) > 1e-9):
        raise DataError(
            "the zero level is defined twice",
            value=text,
            where=listed(r for r, k in zip(model.rows, model.kinds, strict=True) if k == "known"),
            advice="Leave out the known numbers, or do not ask for a mean or a free net",
        )
    step = directions @ (seen / float(seen @ seen))
    turned = np.linalg.svd(seen[None, :])[2][1:]
    remaining = sparse.csc_array(directions @ sparse.csc_array(turned.T))
    remaining.data[np.abs(remaining.data) < 1e-9] = 0.0
    remaining.eliminate_zeros()
    still_open = np.zeros(estimate.size, dtype=bool)
    still_open[remaining.indices] = True
    right = np.zeros(system.design.shape[1])
    right[: system.free.size] = mean_of[system.free]
    cross = np.zeros(estimate.size)
    cross[system.free] = normals.solve(right)[: system.free.size]
    solution = estimate - step * (float(mean_of @ estimate) - rule.mean)
    return ZeroDefinition(text, solution, still_open, remaining, step, mean_of, cross)


def _mean_of(model: LinearModel, rule: ZeroRule) -> tuple[NDArray[np.float64], str]:
    place = {n.site: i for i, n in enumerate(model.unknowns) if isinstance(n, NumberOf)}
    sites = list(place) if rule.sites is None else list(rule.sites)
    for site in sites:
        if site not in place:
            raise DataError(
                "the zero level names a site that has no number in the net",
                value=site,
                allowed=f"Sites such as {listed(place)}",
            )
    vector = np.zeros(len(model.unknowns))
    vector[[place[site] for site in sites]] = 1.0 / len(sites)
    if rule.sites is None:
        return vector, f"inner constraints over all {len(sites)} points (free net)"
    if len(sites) == 1:
        return vector, f"the number of {sites[0]}, held at {rule.mean} m2 s-2"
    return vector, f"the mean of {listed(sites)}, held at {rule.mean} m2 s-2"
