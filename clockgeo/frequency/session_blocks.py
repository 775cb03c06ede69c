"""Sessions averaged over blocks: what noise is fitted to, with a mean for each session or more."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import linalg

from clockgeo.frequency.mean import TickSeries, block_means, block_width

__all__ = ["SessionBlocks", "difference", "mean_contrasts", "session_blocks"]


@dataclass(frozen=True, eq=False)
class SessionBlocks:
    """Block means of several sessions on one line.

    Attributes
    ----------
    y, count : float array, shape (B,)
        Mean and number of samples of each block.
    place : int64 array, shape (B,)
        Places of the blocks, in units of the width.
    owner : int64 array, shape (B,)
        Number, from 0, of the mean that the block has.
    width : float
        Length of a block in s.
    """

    y: NDArray[np.float64]
    count: NDArray[np.float64]
    place: NDArray[np.int64]
    owner: NDArray[np.int64]
    width: float

    @property
    def seconds(self) -> NDArray[np.float64]:
        """Middle of each block, from the first one."""
        return np.asarray((self.place - self.place[0]) * self.width, dtype=np.float64)

    @property
    def span(self) -> float:
        """Length in s that holds all blocks."""
        return float(self.place.max() + 1) * self.width

    @property
    def belongs(self) -> NDArray[np.float64]:
        """1 where a block has a mean, shape (B, means)."""
        return np.asarray(self.owner[:, None] == np.arange(self.owner.max() + 1), dtype=np.float64)


def session_blocks(
    series: Sequence[TickSeries], interval: float, *, blocks: int, means: Sequence[int] | None
) -> SessionBlocks:
    """Average sessions over about so many blocks in all.

    Parameters
    ----------
    series : sequence of TickSeries, K items
    interval : float
        Length of a tick in s.
    blocks : int
    means : sequence of int, length K, optional
        Number of the mean that each session has, from 0; each its own if absent.
    """
    first = min(int(one.tick[0]) for one in series)
    width = block_width(series, blocks)
    averaged = [block_means(one, first=first, width=width) for one in series]
    owners = range(len(series)) if means is None else means
    pairs = zip(averaged, owners, strict=True)
    return SessionBlocks(
        np.concatenate([part.mean for part in averaged]),
        np.concatenate([part.count for part in averaged]),
        np.concatenate([part.place for part in averaged]),
        np.concatenate([np.full(part.place.size, owner) for part, owner in pairs]),
        width * interval,
    )


def mean_contrasts(blocks: SessionBlocks) -> NDArray[np.float64]:
    """Orthonormal contrasts that see no mean, shape (blocks, blocks - means)."""
    pieces = []
    for owner in range(int(blocks.owner.max()) + 1):
        members = np.flatnonzero(blocks.owner == owner)
        if members.size > 1:
            piece = np.zeros((blocks.y.size, members.size - 1))
            piece[members] = linalg.null_space(np.ones((1, members.size)))
            pieces.append(piece)
    return np.hstack(pieces) if pieces else np.zeros((blocks.y.size, 0))


def difference(blocks: SessionBlocks) -> NDArray[np.float64]:
    """Weights of the difference that stands for all: of the later means, or half, and the first."""
    if blocks.owner.max() > 0:
        early = blocks.owner == blocks.owner[0]
    else:
        early = np.arange(blocks.y.size) < blocks.y.size // 2
    share = np.where(early, -blocks.count, 0.0) / blocks.count[early].sum()
    late = ~early
    return np.asarray(share + np.where(late, blocks.count, 0.0) / blocks.count[late].sum())
