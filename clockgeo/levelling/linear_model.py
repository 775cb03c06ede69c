"""The one linear model that levelling, adjustment and planning share.

    l = A x + L z + n,      z ~ (0, I),      n ~ (0, N)

l are observations in m² s⁻², x the unknowns (geopotential numbers, nominal-ratio errors, datum
parameters ...), z standardised effects of unit variance, each of which may act on many
observations, and n the noise. An effect that two observations share is the same column of L, so
the covariance V = N + L Lᵀ is built, never assumed.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import sparse

from clockgeo.errors import DataError

__all__ = ["LinearModel", "ModelBuilder"]


@dataclass(frozen=True, eq=False)
class LinearModel:
    """Observations, unknowns and effects of one system (see the module's head).

    Attributes
    ----------
    unknowns : tuple of Hashable, length p
        Names of the unknowns, such as ``("number", "harbel")``.
    effects : tuple of Hashable, length q
        Names of the standardised effects.
    rows : tuple of str, length n
        Observation ids.
    kinds : tuple of str, length n
        What each observation is, such as ``"clock"`` or ``"levelled"``.
    values : float array, shape (n,)
        Observed values l in m² s⁻².
    design : sparse array, shape (n, p)
        A, the derivative of each observation with respect to each unknown.
    loading : sparse array, shape (n, q)
        L, in m² s⁻²: sensitivity times standard uncertainty, with sign.
    noise : sparse array, shape (n, n)
        N in m⁴ s⁻⁴, symmetric, block-diagonal; may be singular.
    """

    unknowns: tuple[Hashable, ...]
    effects: tuple[Hashable, ...]
    rows: tuple[str, ...]
    kinds: tuple[str, ...]
    values: NDArray[np.float64]
    design: sparse.csr_array
    loading: sparse.csr_array
    noise: sparse.csr_array

    def covariance(self) -> NDArray[np.float64]:
        """Dense V = N + L Lᵀ, shape (n, n), in m⁴ s⁻⁴."""
        return np.asarray((self.noise + self.loading @ self.loading.T).toarray())


@dataclass
class ModelBuilder:
    """Collects observations one by one and puts the `LinearModel` together.

    Unknowns and effects come into being when an observation first names them; their order is the
    order of that first naming, so that equal input gives equal matrices.
    """

    _unknowns: dict[Hashable, int] = field(default_factory=dict)
    _effects: dict[Hashable, int] = field(default_factory=dict)
    _rows: dict[str, int] = field(default_factory=dict)
    _kinds: list[str] = field(default_factory=list)
    _values: list[float] = field(default_factory=list)
    _design: list[tuple[int, int, float]] = field(default_factory=list)
    _loading: list[tuple[int, int, float]] = field(default_factory=list)
    _noise: list[tuple[int, int, float]] = field(default_factory=list)

    def observe(
        self,
        row: str,
        *,
        kind: str,
        value: float,
        on: Mapping[Hashable, float],
        effects: Mapping[Hashable, float] | None = None,
        variance: float = 0.0,
    ) -> None:
        """Add one observation.

        Parameters
        ----------
        row : str
            Its id, used once.
        kind : str
            What it is.
        value : float
            Observed value in m² s⁻².
        on : mapping
            Unknown -> coefficient in the row of A.
        effects : mapping, optional
            Effect -> loading in m² s⁻² (sign times sensitivity times standard uncertainty).
        variance : float
            Variance of the row's own noise in m⁴ s⁻⁴.

        Raises
        ------
        DataError
            If the id is taken, a number is not finite or the variance is negative.
        """
        if row in self._rows:
            raise DataError("an observation id is used twice", value=row, advice="Rename one")
        loadings = dict(effects or {})
        numbers = [value, variance, *on.values(), *loadings.values()]
        if not np.all(np.isfinite(numbers)) or variance < 0.0:
            raise DataError(
                "an observation has a number that is not finite, or a negative variance",
                value=f"value {value}, variance {variance}",
                where=f"observation {row}",
            )
        place = self._rows.setdefault(row, len(self._rows))
        self._kinds.append(kind)
        self._values.append(value)
        self._fill(self._design, self._unknowns, place, on)
        self._fill(self._loading, self._effects, place, loadings)
        if variance:
            self._noise.append((place, place, variance))

    @staticmethod
    def _fill(
        entries: list[tuple[int, int, float]],
        names: dict[Hashable, int],
        place: int,
        coefficients: Mapping[Hashable, float],
    ) -> None:
        for name, coefficient in coefficients.items():
            column = names.setdefault(name, len(names))
            if coefficient:
                entries.append((place, column, float(coefficient)))

    def correlate(self, rows: Sequence[str], covariance: ArrayLike) -> None:
        """Add a full covariance block in m⁴ s⁻⁴ to the noise of the named `rows`."""
        places = [self._rows[row] for row in rows]
        block = np.asarray(covariance, dtype=np.float64)
        if block.shape != (len(places), len(places)):
            raise DataError(
                "a covariance block does not fit its rows",
                value=f"shape {block.shape}",
                allowed=f"Shape {(len(places), len(places))} for {len(places)} rows",
            )
        self._noise += [
            (i, j, float(block[a, b]))
            for a, i in enumerate(places)
            for b, j in enumerate(places)
            if block[a, b]
        ]

    def build(self) -> LinearModel:
        """Return the model of all observations so far."""
        n, p, q = len(self._rows), len(self._unknowns), len(self._effects)
        return LinearModel(
            unknowns=tuple(self._unknowns),
            effects=tuple(self._effects),
            rows=tuple(self._rows),
            kinds=tuple(self._kinds),
            values=np.array(self._values, dtype=np.float64),
            design=_sparse(self._design, (n, p)),
            loading=_sparse(self._loading, (n, q)),
            noise=_sparse(self._noise, (n, n)),
        )


def _sparse(entries: list[tuple[int, int, float]], shape: tuple[int, int]) -> sparse.csr_array:
    rows, columns, values = zip(*entries, strict=True) if entries else ((), (), ())
    numbers = np.array(values, dtype=np.float64)
    return sparse.csr_array(sparse.coo_array((numbers, (rows, columns)), shape=shape))
