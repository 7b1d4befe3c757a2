"""One suspect as the catalogue sees it, and what the network would expect of other rows in its place."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.blunders.context import Context
from adjust.blunders.mistakes.entries import height_entries, value_entries
from adjust.blunders.mistakes.entry import Entry
from adjust.field_book.written import Line
from adjust.job import Job
from adjust.observations import Observations


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
        return values % FULL_TURN if self.context.observations.full_circle else values

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
        """The entries of the observed value itself, or of what a group shares."""
        return tuple(value_entries(self))

    @cached_property
    def heights(self) -> tuple[Entry, ...]:
        """The instrument and target height of a single sight; a blank cell where none was written."""
        return tuple(height_entries(self))

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
