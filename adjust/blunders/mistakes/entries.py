"""Which numbers of the book a suspect rests on: its value, its heights, a mark's coordinates, raw readings."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.mistakes.control import alternative_coordinates
from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.notation import Notation
from adjust.field_book.schema import AXES
from adjust.field_book.writing import VALUE_COLUMNS
from adjust.field_book.written import Cell, Line
from adjust.observations.sighted import HeightedSight

if TYPE_CHECKING:
    from adjust.blunders.mistakes.suspect import Suspect

HEIGHTS = ("instrument_height", "target_height")
SHARED_HEIGHTS = ("instrument height", "target height")
READINGS = {"direction": "circle", "zenith": "zenith", "slope_distance": "slope"}
"""The column of `pointings.csv` behind each kind."""


def value_entries(suspect: Suspect) -> Iterator[Entry]:
    """The entries of the observed value itself, or of what a group shares."""
    if suspect.kind == "control" or suspect.nature == "control":
        yield from _coordinates(suspect)
    elif suspect.nature in SHARED_HEIGHTS:
        yield _shared_height(suspect)
    elif suspect.kind == "vector":
        yield from _components(suspect)
    elif suspect.kind:
        yield from _value(suspect)


def _value(suspect: Suspect) -> Iterator[Entry]:
    source, cells = suspect.lines[0]
    name = VALUE_COLUMNS[suspect.kind]
    if name not in cells or (name != "direction" and "setup" in cells):
        yield from _readings(suspect)
    else:
        yield Entry(source, name, cells[name], lambda others: suspect.observed - others[:, None])


def height_entries(suspect: Suspect) -> Iterator[Entry]:
    """The instrument and target height of a single sight; a blank cell where none was written."""
    if not suspect.kind or not isinstance(suspect.row_itself, HeightedSight):
        return
    source, cells = suspect.lines[0]
    title = next((cells[name].title for name in HEIGHTS if name in cells), "height_m")
    unit = title.rpartition("_")[2]
    for role, name in enumerate(HEIGHTS):
        yield _height(suspect, role, source, cells.get(name, Cell(f"{name}_{unit}", "")))


def _height(suspect: Suspect, role: int, source: str, cell: Cell) -> Entry:
    return Entry(
        source,
        HEIGHTS[role],
        cell,
        lambda others: suspect.error_if(suspect.with_heights(others, role)),
        lambda other: suspect.with_heights(np.array([other]), role),
    )


def _components(suspect: Suspect) -> Iterator[Entry]:
    """The components of a vector that are suspect."""
    source, cells = suspect.lines[0]
    for place, component in enumerate(suspect.components.tolist()):
        name = f"d{AXES[component]}"
        if name in cells:
            axis = np.eye(suspect.size)[place]
            yield Entry(source, name, cells[name], _scaled(float(suspect.observed[place]), axis))


def _scaled(written: float, effect: FloatArray) -> Callable[[FloatArray], FloatArray]:
    """Errors (k, q) of what is written against other values (k,), times their `effect` (q,)."""
    return lambda others: (written - others)[:, None] * effect


def _shared_height(suspect: Suspect) -> Entry:
    """The height that a group of sights shares."""
    role = SHARED_HEIGHTS.index(suspect.nature)
    source, cells = suspect.lines[0]
    cell = cells.get(HEIGHTS[role], Cell(f"{HEIGHTS[role]}_m", ""))
    return Entry(source, HEIGHTS[role], cell, _scaled(float(suspect.row_itself.heights[0, role]), np.ones(1)))


def _coordinates(suspect: Suspect) -> Iterator[Entry]:
    """The coordinates of a mark that are suspect."""
    source, cells = suspect.lines[0]
    for name in ("easting", "northing", "latitude", "longitude", "height"):
        if name in cells:
            error_of = alternative_coordinates(suspect.context, suspect.mark, name)
            if error_of is not None:
                yield Entry(source, name, cells[name], error_of)


def _readings(suspect: Suspect) -> Iterator[Entry]:
    """Readings of which the observed value is a mean, or a sum of rises."""
    last = len(suspect.lines) - 1
    for place, (source, cells) in enumerate(suspect.lines):
        for name, effect in _effects(suspect, cells, first=place == 0, last=place == last).items():
            written = Notation.of(cells[name]).number
            yield Entry(source, name, cells[name], _scaled(written, np.array([effect])))


def _effects(suspect: Suspect, cells: Line, *, first: bool, last: bool) -> dict[str, float]:
    """How much of the error of each reading of a line enters the observed value.

    A section starts with the backsight of its first line and ends with the foresight of its last one.
    """
    if suspect.kind == "height_difference":
        behind = {} if last else {"backsight": 1.0}
        ahead = {} if first else {"foresight": -1.0, "intermediate": -1.0}
        return {name: effect for name, effect in {**behind, **ahead}.items() if name in cells}
    name = READINGS.get(suspect.kind)
    if name is None or name not in cells:
        return {}
    right = name == "zenith" and Notation.of(cells[name]).number > np.pi
    return {name: (-1.0 if right else 1.0) / len(suspect.lines)}
