"""One suspect as the catalogue sees it: its entries in the book, and what other entries would have meant."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np

from adjust.angles import wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.blunders.context import Context, Correction
from adjust.blunders.mistakes.control import alternative_coordinates
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.notation import Notation
from adjust.field_book.schema import AXES
from adjust.field_book.writing import VALUE_COLUMNS
from adjust.field_book.written import Cell, Line
from adjust.job import Job
from adjust.observations import Observations
from adjust.observations.sighted import HeightedSight

HEIGHTS = ("instrument_height", "target_height")
READINGS = {"direction": "circle", "zenith": "zenith", "slope_distance": "slope"}
"""The column of `pointings.csv` behind each kind."""


@dataclass(frozen=True)
class Entry:
    """One number of the book that the suspect rests on.

    `source` is its file and line, `name` the plain name of its column. `error_of` says for other values (k,) of it,
    metres or radians, by how much (k, q) the written one is wrong if they are right; `replaced` gives the row with
    another value where that is not just another observed value.
    """

    source: str
    name: str
    cell: Cell
    error_of: Callable[[FloatArray], FloatArray]
    replaced: Callable[[float], Observations] | None = None

    @cached_property
    def notation(self) -> Notation:
        """How it is written."""
        return Notation.of(self.cell)

    @property
    def value(self) -> float:
        """What is written, metres or radians; NaN for a blank cell."""
        return self.notation.number

    def correction(self, text: str) -> Correction:
        """The entry with another text."""
        return Correction(self.source, self.cell.title, text)

    def remedy(self, what: str, text: str, value: float) -> Remedy:
        """Another text, with what would have happened to it."""
        detail = f"{text} in place of {self.cell.text or 'a blank'}"
        return Remedy(what, detail, (self.correction(text),), None if self.replaced is None else self.replaced(value))

    def candidates(self, texts: list[str], whats: list[str], shares: list[float] | None = None) -> Candidates | None:
        """Of other texts, those that could stand in the cell; each with what would have happened to it."""
        values = np.array([self.notation.read(text) for text in texts])
        sound = np.flatnonzero(~np.isnan(values) & (values != self.value))
        if not len(sound):
            return None
        weights = np.ones(len(texts)) if shares is None else np.array(shares)

        def remedy(place: int, error: FloatArray) -> Remedy:
            chosen = int(sound[place])
            return self.remedy(whats[chosen], texts[chosen], float(values[chosen]))

        return Candidates(self.error_of(values[sound]), weights[sound] / weights[sound].sum(), remedy)

    def valued(self, values: FloatArray, what: Callable[[int], str], shares: FloatArray | None = None) -> Candidates:
        """Of other values (k,), metres or radians, written as the cell writes."""
        weights = np.ones(len(values)) if shares is None else shares

        def remedy(place: int, error: FloatArray) -> Remedy:
            return self.remedy(what(place), self.notation.write(float(values[place])), float(values[place]))

        return Candidates(self.error_of(values), weights / weights.sum(), remedy)


@dataclass(frozen=True)
class Suspect:
    """A context, and the questions that mistakes put to it."""

    context: Context

    @property
    def job(self) -> Job:
        """The job it stands in."""
        return self.context.job

    @property
    def nature(self) -> str:
        """See `Hypothesis`."""
        return self.context.hypothesis.nature

    @cached_property
    def kind(self) -> str:
        """The kind of a single row; empty for a group."""
        return self.context.observations.kind if self.context.hypothesis.single else ""

    @cached_property
    def size(self) -> int:
        """Components q of the error."""
        return len(self.context.estimated_error)

    @property
    def angular(self) -> bool:
        """Whether the error is an angle."""
        return self.context.hypothesis.unit == "rad"

    @cached_property
    def row_itself(self) -> Any:
        """The suspect's row, or the first row of a group, as one row of its kind."""
        return self.context.observations.take(np.array([self.context.row]))

    @property
    def mark(self) -> int:
        """The mark of a group, or of a coordinate of control."""
        mark = self.context.hypothesis.mark
        return int(self.row_itself.marks[0, 0]) if mark is None else mark

    @property
    def observed(self) -> FloatArray:
        """The observed value (q,) of the components that are suspect."""
        observed: FloatArray = self.row_itself.observed[0, self.components]
        return observed

    @cached_property
    def components(self) -> IntArray:
        """Which components (q,) of the row are suspect."""
        every = self.context.observations.components
        return np.array([every.index(name) for name in self.context.hypothesis.components if name in every])

    def in_range(self, values: FloatArray) -> FloatArray:
        """Angles brought to the circle that the kind counts on."""
        return values % (2 * np.pi) if self.context.observations.full_circle else values

    def copies(self, count: int, **changes: Any) -> Observations:
        """The suspect's row so many times, with other columns."""
        rows = self.row_itself.take(np.zeros(count, dtype=np.int64))
        copies: Observations = replace(rows, **changes)
        return copies

    def expected(self, rows: Observations) -> FloatArray:
        """What the network expects (rows, components) of rows like the suspect's, orientation and all."""
        with np.errstate(invalid="ignore", divide="ignore"):
            predicted = rows.predict(self.context.geometry)
        return predicted if rows.setup is None else predicted - self.context.orientations[rows.setup][:, None]

    def error_if(self, rows: Observations) -> FloatArray:
        """The error (rows, q) of the row as it is booked, if it should have been booked as `rows`, the value kept."""
        away = self.expected(rows) - self.expected(self.row_itself)
        if not self.angular:
            return away[:, self.components]
        return wrapped(away)[:, self.components]

    @cached_property
    def lines(self) -> tuple[tuple[str, Line], ...]:
        """File and line of each line of the book behind the suspect, with its cells."""
        context = self.context
        place, row = context.observations.provenance, context.row
        if self.nature == "control":
            place, row = self.job.marks.provenance, self.mark
        further = () if place.further is None else place.further[row]
        file = place.files[place.file[row]]
        numbers = (place.line[row], *further)
        return tuple(
            (f"{file}:{number}", cells)
            for number, cells in zip(numbers, (context.cells, *context.further_cells), strict=False)
        )

    @cached_property
    def values(self) -> tuple[Entry, ...]:
        """The entries of the observed value itself, or of the shared figure of a group."""
        if self.kind == "control" or self.nature == "control":
            return tuple(self._coordinates())
        if self.nature in ("instrument height", "target height"):
            return tuple(self._shared_height())
        if not self.context.hypothesis.single:
            return ()
        if self.kind == "vector":
            return tuple(self._components())
        source, cells = self.lines[0]
        name = VALUE_COLUMNS[self.kind]
        if name in cells and len(self.lines) == 1 and "circle" not in cells:
            return (Entry(source, name, cells[name], lambda others: self.observed - others[:, None]),)
        return tuple(self._readings())

    @cached_property
    def heights(self) -> tuple[Entry, ...]:
        """The instrument and target height of a single sight; a blank cell where none was written."""
        if not isinstance(self.row_itself, HeightedSight) or not self.context.hypothesis.single:
            return ()
        source, cells = self.lines[0]
        title = next((cells[name].title for name in HEIGHTS if name in cells), "height_m")
        unit = title.rpartition("_")[2]
        return tuple(
            Entry(
                source,
                name,
                cells.get(name, Cell(f"{name}_{unit}", "")),
                lambda others, role=role: self.error_if(self.with_heights(others, role)),  # type: ignore[misc]
                lambda other, role=role: self.with_heights(np.array([other]), role),  # type: ignore[misc]
            )
            for role, name in enumerate(HEIGHTS)
        )

    @property
    def numbers(self) -> tuple[Entry, ...]:
        """All entries with digits."""
        return tuple(entry for entry in (*self.values, *self.heights) if entry.cell.text)

    def with_heights(self, others: FloatArray, role: int) -> Observations:
        """The row with other instrument (`role` 0) or target heights (k,)."""
        heights = np.repeat(self.row_itself.heights, len(others), axis=0)
        heights[:, role] = others
        return self.copies(len(others), heights=heights)

    def with_marks(self, others: IntArray, role: int) -> Observations:
        """The row with other marks (k,) in one role."""
        marks = np.repeat(self.row_itself.marks, len(others), axis=0)
        marks[:, role] = others
        return self.copies(len(others), marks=marks)

    def _components(self) -> Iterator[Entry]:
        """The components of a vector that are suspect."""
        source, cells = self.lines[0]
        for place, component in enumerate(self.components.tolist()):
            name = f"d{AXES[component]}"
            if name in cells:
                yield Entry(source, name, cells[name], self._along(place, self.observed[place]))

    def _along(self, place: int, written: float) -> Callable[[FloatArray], FloatArray]:
        """Errors of one component (k, q): what is written minus other values."""
        axis = np.eye(self.size)[place]
        return lambda others: (written - others)[:, None] * axis

    def _shared_height(self) -> Iterator[Entry]:
        """The height that a group of sights shares."""
        role = HEIGHTS.index(self.nature.replace(" ", "_"))
        source, cells = self.lines[0]
        written = float(self.row_itself.heights[0, role])
        cell = cells.get(HEIGHTS[role], Cell(f"{HEIGHTS[role]}_m", ""))
        yield Entry(source, HEIGHTS[role], cell, lambda others: (written - others)[:, None])

    def _coordinates(self) -> Iterator[Entry]:
        """The coordinates of a mark that are suspect."""
        source, cells = self.lines[0]
        for name in ("easting", "northing", "latitude", "longitude", "height"):
            if name in cells:
                error_of = alternative_coordinates(self.context, self.mark, name)
                if error_of is not None:
                    yield Entry(source, name, cells[name], error_of)

    def _readings(self) -> Iterator[Entry]:
        """Readings of which the observed value is a mean, or a sum of rises."""
        last = len(self.lines) - 1
        for place, (source, cells) in enumerate(self.lines):
            for name, factor in self._effects(cells, first=place == 0, last=place == last).items():
                written = Notation.of(cells[name]).number
                yield Entry(source, name, cells[name], self._scaled(written, factor))

    def _effects(self, cells: Line, *, first: bool, last: bool) -> dict[str, float]:
        """How much of the error of each reading of a line enters the observed value."""
        if self.kind == "height_difference":
            behind = {"backsight": 1.0} if not last else {}
            ahead = {"foresight": -1.0, "intermediate": -1.0} if not first else {}
            return {name: factor for name, factor in {**behind, **ahead}.items() if name in cells}
        name = READINGS.get(self.kind)
        if name is None or name not in cells:
            return {}
        right = name == "zenith" and Notation.of(cells[name]).number > np.pi
        return {name: (-1.0 if right else 1.0) / len(self.lines)}

    @staticmethod
    def _scaled(written: float, factor: float) -> Callable[[FloatArray], FloatArray]:
        return lambda others: factor * (written - others)[:, None]
