"""Names of marks beside them, as many as find room."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.reports.page.places import WIDTH, Places

LETTER, LINE = 6.6, 13.0
"""Units of the drawing that a letter is wide and a line of text high."""
MOST = 300
"""Labels on the drawing as it first stands; the script places more as the reader comes nearer."""
CANDIDATES = 2000
"""The most important marks are tried; among more there is no room."""
LONGEST = 18
"""Letters of a name that are shown."""
CELL = 40.0
"""Units of the cells in which neighbours are looked for."""
SIDES = ((8.0, -6.0, "start"), (-8.0, -6.0, "end"), (8.0, 14.0, "start"), (-8.0, 14.0, "end"))
"""Where a label may stand: right above, left above, right below, left below its mark."""

Box = tuple[float, float, float, float]


@dataclass(frozen=True)
class Label:
    """A mark's name at x, y, which is the start or the end of its base line."""

    mark: int
    text: str
    x: float
    y: float
    anchor: str


class _Taken:
    """Boxes that are taken, found by cells."""

    def __init__(self) -> None:
        self.cells: dict[tuple[int, int], list[Box]] = {}

    def add(self, box: Box) -> None:
        for cell in self._cells(box):
            self.cells.setdefault(cell, []).append(box)

    def free(self, box: Box) -> bool:
        return not any(_overlap(box, other) for cell in self._cells(box) for other in self.cells.get(cell, ()))

    @staticmethod
    def _cells(box: Box) -> list[tuple[int, int]]:
        left, top, right, bottom = (int(edge // CELL) for edge in box)
        return [(column, row) for column in range(left, right + 1) for row in range(top, bottom + 1)]


def _overlap(one: Box, other: Box) -> bool:
    return one[0] < other[2] and other[0] < one[2] and one[1] < other[3] and other[1] < one[3]


def place_labels(places: Places, names: Sequence[str], importance: FloatArray) -> tuple[Label, ...]:
    """Labels that neither overlap each other nor cover a mark, the most important marks first."""
    drawn = places.drawn
    taken, labels = _Taken(), []
    for x, y in places.positions[drawn].tolist():
        taken.add((x - 4, y - 4, x + 4, y + 4))
    for mark in drawn[np.argsort(-importance[drawn], kind="stable")][:CANDIDATES].tolist():
        label = _placed(mark, shortened(names[mark]), places, taken)
        if label is not None:
            labels.append(label)
        if len(labels) == MOST:
            break
    return tuple(labels)


def shortened(name: str) -> str:
    """A name that fits beside its mark."""
    return name if len(name) <= LONGEST else f"{name[: LONGEST - 1]}…"


def _placed(mark: int, text: str, places: Places, taken: _Taken) -> Label | None:
    x, y = places.positions[mark].tolist()
    width = LETTER * len(text)
    for right, down, anchor in SIDES:
        start = x + right if anchor == "start" else x + right - width
        box = (start, y + down - LINE + 2, start + width, y + down + 2)
        if taken.free(box) and box[0] >= 0 and box[2] <= WIDTH:
            taken.add(box)
            return Label(mark, text, round(x + right, 2), round(y + down, 2), anchor)
    return None
