"""Small nets as linear models, for tests."""

from __future__ import annotations

from clockgeo.levelling.linear_model import LinearModel, ModelBuilder
from clockgeo.levelling.session_rows import NumberOf, add_known_number


def level_net(known, lines):
    """A net of differences.

    `known` maps a point to (value, u); `lines` are (from, to, difference, u), named "from-to".
    """
    builder = ModelBuilder()
    for point, (value, u) in known.items():
        add_known_number(builder, point, value, u)
    for start, end, value, u in lines:
        builder.observe(
            f"{start}-{end}",
            kind="levelled",
            value=value,
            on={NumberOf(end): 1.0, NumberOf(start): -1.0},
            variance=u**2,
        )
    return builder.build()


def grid_net(rng, size=4, *, u=0.01, blunders=None) -> tuple[LinearModel, list[str]]:
    """A square grid of points with lines to the right and down, true numbers zero."""
    lines = []
    for row in range(size):
        for column in range(size):
            here = f"p{row}.{column}"
            ends = [(row, column + 1), (row + 1, column)]
            lines += [
                (here, f"p{end[0]}.{end[1]}", u * rng.standard_normal(), u)
                for end in ends
                if max(end) < size
            ]
    for place, bias in (blunders or {}).items():
        start, end, value, spread = lines[place]
        lines[place] = (start, end, value + bias, spread)
    return level_net({"p0.0": (0.0, 0.0)}, lines), [f"{a}-{b}" for a, b, _, _ in lines]
