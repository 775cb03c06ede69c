"""What the data cannot tell, in words, before anything is solved."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from clockgeo.levelling.linear_model import LinearModel
from clockgeo.levelling.session_rows import NumberOf
from clockgeo.network.null_space import NullSpace, null_space_of
from clockgeo.network.unknowns import TERM_WORDS, DatumTerm

__all__ = ["Gap", "Identifiability", "identify", "listed"]

_ON_ONE_LINE = 1e-5
"""Width over length below which sites count as lying on one line."""


@dataclass(frozen=True)
class Gap:
    """One thing that the observations leave open.

    Attributes
    ----------
    unknowns : tuple of Hashable
        Unknowns that take part; none of them has a value.
    text : str
        What is open, why, and what is missing.
    """

    unknowns: tuple[Hashable, ...]
    text: str


@dataclass(frozen=True, eq=False)
class Identifiability:
    """Rank of a model and what follows from it.

    Attributes
    ----------
    unknowns, rank : int
        Number of unknowns, and how many combinations of them the observations determine.
    null_space : NullSpace
    gaps : tuple of Gap
        One for each direction of the null space.
    """

    unknowns: int
    rank: int
    null_space: NullSpace
    gaps: tuple[Gap, ...]

    @property
    def complete(self) -> bool:
        """Whether everything is determined."""
        return not self.gaps


def identify(model: LinearModel) -> Identifiability:
    """Find what the rows of a model do not determine.

    Parameters
    ----------
    model : LinearModel
        Unknowns of the types `NumberOf` and `DatumTerm` are spoken of in the words of
        the trade, others by their own text.

    Returns
    -------
    Identifiability
    """
    null = null_space_of(model.design)
    gaps = []
    for column in range(null.dimension):
        entries = slice(null.directions.indptr[column], null.directions.indptr[column + 1])
        places, weights = null.directions.indices[entries], null.directions.data[entries]
        names = tuple(model.unknowns[place] for place in places)
        gaps.append(Gap(names, _sentence(model, names, weights)))
    count = len(model.unknowns)
    return Identifiability(count, count - null.dimension, null, tuple(gaps))


def listed(names: Iterable[str], *, most: int = 4) -> str:
    """Join names as in a sentence: a, b and c; beyond `most` the first ones and how many more."""
    every = list(names)
    if len(every) > most:
        return f"{', '.join(every[: most - 1])} and {len(every) - most + 1} more"
    return " and ".join(filter(None, [", ".join(every[:-1]), every[-1]])) if every else ""


def _sentence(model: LinearModel, names: Sequence[Hashable], weights: NDArray[np.float64]) -> str:
    sites = [name.site for name in names if isinstance(name, NumberOf)]
    others = [name for name in names if not isinstance(name, NumberOf)]
    if sites and bool(np.all(np.abs(np.abs(weights) - 1.0) < 1e-6)):
        return _level_sentence(model, sites, others)
    datums = sorted({name.datum for name in others if isinstance(name, DatumTerm)})
    parts = [_datum_sentence(model, datum, others) for datum in datums]
    rest = [str(name) for name in others if not isinstance(name, DatumTerm)]
    if rest:
        parts.append(f"{listed(rest)} not estimable; needs a tie to points known otherwise")
    if sites:
        points = f"point{'s' if len(sites) > 1 else ''}"
        start = "and so " if parts else ""
        parts.append(f"{start}the number of {points} {listed(sites)} not estimable")
    return "; ".join(parts)


def _level_sentence(model: LinearModel, sites: list[str], others: Sequence[Hashable]) -> str:
    everything = sum(isinstance(name, NumberOf) for name in model.unknowns)
    along = f", with them the {listed(map(str, others))}" if others else ""
    if len(sites) == everything:
        return (
            f"the whole net has no zero level: the numbers of its {len(sites)} points are known "
            f"up to one constant{along}; state a known number, or fix the mean of some sites"
        )
    points = "points" if len(sites) > 1 else "point"
    verb = "hang" if len(sites) > 1 else "hangs"
    return (
        f"{points} {listed(sites)} ({len(sites)} in all) {verb} on no tie to the rest of the "
        f"net{along}; needs a clock session, a GNSS height with a geoid, or a levelled line there"
    )


def _datum_sentence(model: LinearModel, datum: str, names: Sequence[Hashable]) -> str:
    terms = [
        TERM_WORDS[name.term]
        for name in names
        if isinstance(name, DatumTerm) and name.datum == datum
    ]
    verdict = f"datum {datum}: {listed(terms)} not estimable"
    north_east = _tie_geometry(model, datum)
    count = north_east.shape[0]
    if count == 0:
        return f"{verdict}: none of its points is known from anything else; needs a tie"
    how_many = {1: "one site", 2: "two sites"}.get(count, f"{count} sites")
    line = _line_words(north_east) if count > 1 else ""
    if line:
        return f"{verdict} from {how_many} {line}; needs one more site off that line"
    asked = sum(isinstance(u, DatumTerm) and u.datum == datum for u in model.unknowns)
    missing = max(asked - count, 1)
    return (
        f"{verdict} from {how_many}; needs {missing} more site{'s' if missing > 1 else ''}, "
        "not on one line with the others"
    )


def _line_words(north_east: NDArray[np.float64]) -> str:
    """Whether sites lie on one line, and on which."""
    centred = north_east - north_east.mean(axis=0)
    sizes = np.linalg.svd(centred, compute_uv=False)
    if sizes[-1] > _ON_ONE_LINE * sizes[0]:
        return ""
    north, east = np.abs(centred).max(axis=0)
    if east <= _ON_ONE_LINE * north:
        return "on a meridian"
    if north <= _ON_ONE_LINE * east:
        return "on a parallel"
    return "on one line"


def _tie_geometry(model: LinearModel, datum: str) -> NDArray[np.float64]:
    """Places (north, east) in m of those points of a datum that are known without it, each once."""
    place = {name: column for column, name in enumerate(model.unknowns)}
    own = [column for name, column in place.items() if getattr(name, "datum", None) == datum]
    design = sparse.csr_array(model.design)
    of_datum = np.diff(sparse.csr_array(design[:, own]).indptr) > 0
    without = null_space_of(sparse.csr_array(design[np.flatnonzero(~of_datum)]))
    numbers = np.array([isinstance(name, NumberOf) for name in model.unknowns])
    rows = sparse.csr_array(design[np.flatnonzero(of_datum)])
    tilts = [place.get(DatumTerm(datum, term)) for term in ("tilt_north", "tilt_east")]
    scale = place.get(DatumTerm(datum, "offset"))
    open_part = sparse.csr_array(without.directions)
    levels: dict[bytes, set[tuple[float, float]]] = {}
    for line in range(rows.shape[0]):
        entries = slice(rows.indptr[line], rows.indptr[line + 1])
        coefficients = dict(zip(rows.indices[entries], rows.data[entries], strict=True))
        points = [column for column in coefficients if numbers[column]]
        per_offset = coefficients.get(scale, -1.0) if scale is not None else -1.0
        where = [
            0.0 if column is None else float(coefficients.get(column, 0.0) / per_offset)
            for column in tilts
        ]
        level = np.round(open_part[points].toarray(), 9).tobytes()
        levels.setdefault(level, set()).add((where[0], where[1]))
    if not levels:
        return np.zeros((0, 2))
    zero = np.zeros((1, without.dimension)).tobytes()
    ties = levels.get(zero) or max(levels.values(), key=len)
    if zero not in levels and len(ties) == 1:
        ties = set()
    return np.array(sorted(ties)).reshape(-1, 2)
