"""Long records made drawable: nothing that stands out may get lost."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from clockgeo.report.envelope import days_utc, envelope, stretches
from clockgeo.times import tai_from_iso


@given(
    st.lists(st.integers(0, 10_000), min_size=0, max_size=200, unique=True),
    st.integers(1, 60),
    st.integers(0, 2**32 - 1),
)
def test_it_holds_the_extremes_of_every_column(epochs, columns, seed):
    start, stop = 0, 10_001
    tai = np.array(sorted(epochs), dtype=np.int64)
    y = np.random.default_rng(seed).standard_normal(tai.size)
    drawn = envelope(tai, y, start, stop, columns)
    edges = np.floor(start + np.arange(1, columns) * (stop - start) / columns)
    column = np.searchsorted(edges, tai, side="right")  # column by column, the slow way
    expected = [(y[column == c].min(), y[column == c].max()) for c in np.unique(column)]
    assert np.array_equal(drawn.column, np.unique(column))
    assert [*zip(drawn.low, drawn.high, strict=True)] == expected
    assert all(tai[column == c][0] == t for c, t in zip(drawn.column, drawn.tai_ns, strict=True))


def test_time_axis_starts_where_unix_does():
    # 1970-01-01 is MJD 40587; UTC with whole seconds starts in 1972
    assert days_utc(np.array([tai_from_iso("2027-05-03T06:00:00Z")]))[0] == 20941.25


def test_stretches_keep_gaps_that_can_be_seen():
    second = 10**9
    tai = np.array([0, 1, 2, 4, 100, 101], dtype=np.int64) * second
    assert stretches(tai, 1.0, bridging=5.0) == [(0, 5 * second), (100 * second, 102 * second)]
    assert stretches(tai, 1.0, bridging=1000.0) == [(0, 102 * second)]
    assert stretches(tai[:0], 1.0, bridging=5.0) == []
