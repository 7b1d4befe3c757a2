"""The raw tables of a job: readings on their way to observations, and what they say of themselves."""

from __future__ import annotations

import numpy as np

from adjust.field_book.book import Book
from adjust.field_book.columns import TableRows
from adjust.field_book.instruments import Instruments
from adjust.field_book.job_file import JobFile
from adjust.field_book.mistakes import ENOUGH, Mistakes, listed
from adjust.field_book.notes import counted
from adjust.field_book.raw_instruments import InstrumentErrors, Targets
from adjust.field_book.raw_levels import LevelsBuilder
from adjust.field_book.raw_pointings import PointingsBuilder
from adjust.observations import Observations
from adjust.reductions.outcome import LevelsReduced, PointingsReduced, Reduction


class RawTables:
    """Reduces the raw tables of a job, noting mistakes."""

    def __init__(
        self, job_file: JobFile, book: Book, mistakes: Mistakes, precision_mistakes: Mistakes, notes: list[str]
    ) -> None:
        self.book = book
        self.instruments = Instruments.of(job_file)
        self.errors = InstrumentErrors.of(job_file)
        self.targets = Targets.of(job_file)
        self.mistakes = mistakes
        self.precision_mistakes = precision_mistakes
        self.notes = notes
        self.pointings: PointingsReduced | None = None
        self.levels: LevelsReduced | None = None

    @property
    def reduction(self) -> Reduction:
        """What was found."""
        return Reduction(self.pointings, self.levels)

    def reduce(self, rows: TableRows) -> tuple[Observations, ...]:
        """The observations that the rows of a raw table in use make."""
        if rows.table.name == "pointings":
            self._check_shared_setups(rows)
            observations, self.pointings = PointingsBuilder(
                rows,
                self.instruments,
                self.errors,
                self.targets,
                self.book.setups,
                self.mistakes,
                self.precision_mistakes,
                self.notes,
            ).build()
        else:
            observations, self.levels = LevelsBuilder(
                rows,
                self.instruments,
                self.errors,
                self.book.names,
                self.book.lines,
                self.mistakes,
                self.precision_mistakes,
                self.notes,
            ).build()
        return observations

    def note_unused(self, rows: TableRows) -> None:
        """Say which readings have use = no."""
        labels = listed(map(rows.provenance.label, range(len(rows))))
        self.notes.append(f"{counted(len(rows), 'reading')} with use = no left out of the reduction: {labels}")

    def _check_shared_setups(self, rows: TableRows) -> None:
        """A setup is reduced from pointings or stands in the table of directions, not both."""
        for other in self.book.observations:
            if other.table.name == "directions":
                shared = np.isin(rows.indices["setup"], other.indices["setup"])
                for row in np.flatnonzero(shared)[:ENOUGH]:
                    name = self.book.setups.names[rows.indices["setup"][row]]
                    message = f"setup {name!r} stands in directions.csv too; give each occupation its own setup name"
                    rows.complain(self.mistakes, int(row), "setup", message)
