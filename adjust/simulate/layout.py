"""Where the marks of an invented network lie, and which of them see each other."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Frame


@dataclass(frozen=True)
class Layout:
    """Marks on invented ground and the lines between them.

    `local` (n, 3) is metres east, north and up from the layout's south-west corner; `lines` (m, 2) are pairs of marks
    that see each other, each pair once.
    """

    local: FloatArray
    lines: IntArray

    def __len__(self) -> int:
        return len(self.local)

    def coordinates(self, frame: Frame, origin: FloatArray) -> FloatArray:
        """Coordinates (n, 3) in a frame of the marks laid out from `origin` (3,), itself coordinates of the frame."""
        placed = frame.moved(np.tile(origin, (len(self), 1)), self.local * (1.0, 1.0, 0.0))
        placed[:, 2] = origin[2] + self.local[:, 2]
        return placed

    def both_ways(self) -> IntArray:
        """Sights (2m, 2) along every line from both of its ends, sorted by station, then target."""
        sights = np.vstack([self.lines, self.lines[:, ::-1]])
        return sights[np.lexsort((sights[:, 1], sights[:, 0]))]


def triangulated_grid(
    rows: int, columns: int, generator: np.random.Generator, *, spacing: float = 500.0, relief: float = 20.0
) -> Layout:
    """Marks near the knots of a square grid, joined along its sides and one diagonal of each square.

    `spacing` metres between marks, each moved by up to a fifth of it; heights scatter by `relief` metres (1σ).
    About three lines for each mark, six sights at each. Marks count from the south-west corner, row by row.
    """
    number = np.arange(rows * columns).reshape(rows, columns)
    eastward = np.column_stack([number[:, :-1].ravel(), number[:, 1:].ravel()])
    northward = np.column_stack([number[:-1].ravel(), number[1:].ravel()])
    diagonal = np.column_stack([number[:-1, :-1].ravel(), number[1:, 1:].ravel()])
    knots = np.column_stack([np.tile(np.arange(columns), rows), np.repeat(np.arange(rows), columns)]) * spacing
    plan = knots + generator.uniform(-0.2, 0.2, knots.shape) * spacing
    heights = generator.normal(0.0, relief, rows * columns)
    return Layout(np.column_stack([plan, heights]), np.vstack([eastward, northward, diagonal]))


def tied_traverses(
    legs: int, generator: np.random.Generator, *, leg: float = 150.0, apart: float = 120.0, tie_every: int = 3
) -> Layout:
    """Two traverses of `legs` legs side by side, tied across at both ends and at every `tie_every`-th mark.

    Metres: `leg` along each traverse, `apart` between the two. Even numbers are marks of the southern traverse, odd
    ones of the northern.
    """
    along = np.repeat(np.arange(legs + 1) * leg, 2)
    across = np.tile([0.0, apart], legs + 1)
    plan = np.column_stack([along, across]) + generator.uniform(-0.2, 0.2, (2 * legs + 2, 2)) * min(leg, apart)
    heights = generator.normal(0.0, 2.0, len(plan))
    following = np.arange(2 * legs)
    tied = 2 * np.union1d(np.arange(0, legs + 1, tie_every), legs)
    lines = np.vstack([np.column_stack([following, following + 2]), np.column_stack([tied, tied + 1])])
    return Layout(np.column_stack([plan, heights]), lines)


def mark_names(count: int, letter: str = "H") -> tuple[str, ...]:
    """Invented names, all of one length: H001, H002, …"""
    width = len(str(count))
    return tuple(f"{letter}{number:0{width}d}" for number in range(1, count + 1))
