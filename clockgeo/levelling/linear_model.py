"""The one linear model that levelling, adjustment and planning share.

    l = A x + L z + n,      z ~ (0, I),      n ~ (0, N)

l are observations in m² s⁻², x the unknowns (geopotential numbers, nominal-ratio errors, datum
parameters ...), z standardised effects of unit variance, each of which may act on many
observations, and n the noise. An effect that two observations share is the same column of L, so
the covariance V = N + L Lᵀ is built, never assumed.
"""

from __future__ import annotations

from collections.abc import Collection, Hashable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import sparse

from clockgeo.errors import DataError

__all__ = ["LinearModel", "ModelBuilder", "Named"]

Named = tuple[Hashable | list[Hashable], ArrayLike]
"""An unknown or effect common to many rows, or a list of one for each, with its coefficients."""
_Places = NDArray[np.int64]


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

    def without(self, rows: Collection[str]) -> LinearModel:
        """Return the model without some observations; unknowns and effects stay as they are."""
        left_out = set(rows)
        if not left_out:
            return self
        kept = np.array([i for i, row in enumerate(self.rows) if row not in left_out])
        return replace(
            self,
            rows=tuple(self.rows[i] for i in kept),
            kinds=tuple(self.kinds[i] for i in kept),
            values=self.values[kept],
            design=sparse.csr_array(self.design[kept]),
            loading=sparse.csr_array(self.loading[kept]),
            noise=sparse.csr_array(self.noise[kept][:, kept]),
        )


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
    _many: dict[str, list[tuple[_Places, _Places, NDArray[np.float64]]]] = field(
        default_factory=lambda: {"design": [], "loading": [], "noise": []}
    )

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

    def observe_all(
        self,
        rows: Sequence[str],
        *,
        kind: str,
        values: ArrayLike,
        on: Sequence[Named],
        effects: Sequence[Named] = (),
        variance: ArrayLike = 0.0,
    ) -> None:
        """Add many observations of one kind at once.

        Parameters
        ----------
        rows : sequence of str, length m
            Their ids, each used once.
        kind : str
            What they are.
        values : array, shape (m,)
            Observed values in m² s⁻².
        on, effects : sequence of Named
            Unknowns with coefficients, and effects with loadings in m² s⁻²: one name for all rows
            or a list of m names, and a scalar or an array of shape (m,).
        variance : float or array, shape (m,)
            Variance of each row's own noise in m⁴ s⁻⁴.

        Raises
        ------
        DataError
            As `observe`.
        """
        size, start = len(rows), len(self._rows)
        fresh = {row: start + i for i, row in enumerate(rows)}
        taken = fresh.keys() & self._rows.keys()
        if taken or len(fresh) < size:
            twice = min(taken) if taken else next(r for r in rows if list(rows).count(r) > 1)
            raise DataError("an observation id is used twice", value=twice, advice="Rename one")
        observed = np.broadcast_to(np.asarray(values, dtype=np.float64), (size,))
        spread = np.broadcast_to(np.asarray(variance, dtype=np.float64), (size,))
        checked = [observed, spread, *(np.asarray(c, dtype=float) for _, c in (*on, *effects))]
        if not all(np.all(np.isfinite(one)) for one in checked) or np.any(spread < 0.0):
            raise DataError(
                "observations have numbers that are not finite, or negative variances",
                where=f"observations {rows[0]} to {rows[-1]}",
            )
        self._rows.update(fresh)
        self._kinds += [kind] * size
        self._values += observed.tolist()
        places = np.arange(start, start + size)
        for part, names, terms in (
            ("design", self._unknowns, on),
            ("loading", self._effects, effects),
        ):
            self._many[part] += [_entries(places, names, *term) for term in terms]
        self._many["noise"].append((places, places, spread.copy()))

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
        i, j = np.meshgrid(np.array(places, dtype=np.int64), places, indexing="ij")
        self._many["noise"].append((i.ravel(), j.ravel(), block.ravel()))

    def build(self) -> LinearModel:
        """Return the model of all observations so far."""
        n, p, q = len(self._rows), len(self._unknowns), len(self._effects)
        return LinearModel(
            unknowns=tuple(self._unknowns),
            effects=tuple(self._effects),
            rows=tuple(self._rows),
            kinds=tuple(self._kinds),
            values=np.array(self._values, dtype=np.float64),
            design=_sparse(self._design, self._many["design"], (n, p)),
            loading=_sparse(self._loading, self._many["loading"], (n, q)),
            noise=_sparse(self._noise, self._many["noise"], (n, n)),
        )


def _entries(
    places: _Places,
    names: dict[Hashable, int],
    name: Hashable | list[Hashable],
    coefficients: ArrayLike,
) -> tuple[_Places, _Places, NDArray[np.float64]]:
    """Entries of many rows in one matrix; names that are new become columns."""
    if isinstance(name, list):
        found = [names.setdefault(one, len(names)) for one in name]
        columns = np.array(found, dtype=np.int64)
    else:
        columns = np.full(places.size, names.setdefault(name, len(names)))
    values = np.broadcast_to(np.asarray(coefficients, dtype=np.float64), places.shape)
    return places, columns, values


def _sparse(
    single: list[tuple[int, int, float]],
    many: list[tuple[_Places, _Places, NDArray[np.float64]]],
    shape: tuple[int, int],
) -> sparse.csr_array:
    rows, columns, values = zip(*single, strict=True) if single else ((), (), ())
    parts = [(np.array(rows, dtype=int), np.array(columns, dtype=int), np.array(values)), *many]
    places = tuple(np.concatenate([part[axis] for part in parts]) for axis in (0, 1))
    numbers = np.concatenate([part[2] for part in parts]).astype(np.float64)
    matrix = sparse.csr_array(sparse.coo_array((numbers, places), shape=shape))
    matrix.eliminate_zeros()
    return matrix
