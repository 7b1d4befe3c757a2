"""From the rows of `level_book.csv` to height differences."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.columns import TableRows
from adjust.field_book.instruments import Instruments
from adjust.field_book.mistakes import ENOUGH, Mistakes
from adjust.field_book.notes import counted
from adjust.field_book.raw_instruments import InstrumentErrors
from adjust.field_book.vocabulary import NO_NAME, Vocabulary
from adjust.observations import HeightDifferences, Observations, Precision
from adjust.reductions.circle import first_of_groups, number_groups
from adjust.reductions.level_book import Sections, StaffRows, arithmetic_check, faults_of, reduce_levels
from adjust.reductions.outcome import LevelsReduced


@dataclass(frozen=True)
class LevelsBuilder:
    """Reduces the level book of a job, noting mistakes."""

    rows: TableRows
    instruments: Instruments
    errors: InstrumentErrors
    marks: Vocabulary
    lines: Vocabulary
    mistakes: Mistakes
    precision_mistakes: Mistakes
    notes: list[str]

    def build(self) -> tuple[tuple[Observations, ...], LevelsReduced | None]:
        """The rises and what the book says of itself; nothing where a mistake was noted."""
        if self.mistakes.any_in(*self.rows.provenance.files):
            return (), None
        noted = len(self.mistakes), len(self.precision_mistakes)
        book = self._book()
        self._check_lines(book)
        for row, message in faults_of(book)[:ENOUGH] if len(self.mistakes) == noted[0] else ():
            self.rows.complain(self.mistakes, row, None, message)
        if len(self.mistakes) != noted[0]:
            return (), None
        sections = reduce_levels(book)
        marks = np.column_stack([book.mark[sections.start], book.mark[sections.end]])
        sd = self._sds(sections)
        self._check_sections(marks, sections)
        self._take_notes(sections)
        if (len(self.mistakes), len(self.precision_mistakes)) != noted:
            return (), None
        check = arithmetic_check(book, sections, len(self.lines.names))
        used, section = _rows_of(book, sections)
        provenance = self.rows.provenance.take(used).gathered(section, len(sd))
        line = book.line[sections.end]
        rises = HeightDifferences(
            marks=marks,
            observed=sections.rise[:, None],
            provenance=provenance,
            precision=_on_model(sd),
            length=sections.length,
        )
        return (rises,), LevelsReduced(self.lines.names, line, marks, sections, sd, check, provenance)

    def _book(self) -> StaffRows:
        rows = self.rows
        collimation = np.nan_to_num(self.errors.level_collimation[self.instruments.of_rows(rows)])
        return StaffRows(
            rows.indices["line"],
            rows.indices["point"],
            rows.numbers["backsight"],
            rows.numbers["intermediate"],
            rows.numbers["foresight"],
            rows.numbers["backsight_distance"],
            rows.numbers["foresight_distance"],
            collimation,
        )

    def _check_lines(self, book: StaffRows) -> None:
        """The rows of a line follow each other in one file, with one instrument and in one group."""
        line, lines = number_groups(book.line)
        opening = first_of_groups(line, lines)[line]
        used = self.instruments.of_rows(self.rows)
        again = np.flatnonzero((np.diff(book.line, prepend=-1) != 0) & (opening != np.arange(len(book))))
        for row in again[:ENOUGH]:
            name, place = self.lines.names[book.line[row]], self.rows.provenance.label(int(opening[row]))
            message = (
                f"line {name!r} began in {place} and was left; keep its rows together, or give this run another name"
            )
            self.rows.complain(self.mistakes, int(row), "line", message)
        for row in np.flatnonzero(used != used[opening])[:ENOUGH]:
            message = "a line is levelled with one instrument; give the second part another line name"
            self.rows.complain(self.mistakes, int(row), "instrument", message)
        group = self.rows.indices["group"]
        for row in np.flatnonzero(group != group[opening])[:ENOUGH]:
            message = "a line belongs to one group; write it in every row, or give the second part another line name"
            self.rows.complain(self.mistakes, int(row), "group", message)
        for row in np.flatnonzero(self.rows.provenance.file != self.rows.provenance.file[opening])[:1]:
            message = "the line began in another file; give this run another name"
            self.rows.complain(self.mistakes, int(row), "line", message)

    def _sds(self, sections: Sections) -> FloatArray:
        """Sds (sections,) from the length of the section, or else from its setups; their lack is noted."""
        used = self.instruments.of_rows(self.rows)[sections.end]
        by_length = self.instruments.level_per_root_metre[used] * np.sqrt(sections.length)
        by_setups = self.instruments.level_per_setup[used] * np.sqrt(sections.setups)
        sd = np.where(np.isnan(by_length), by_setups, by_length)
        for row in np.flatnonzero(np.isnan(sd))[:1]:
            instrument = used[row]
            message = "the line names no instrument; set levels_instrument in [defaults] of the job file"
            if instrument != NO_NAME:
                name = self.instruments.names[instrument]
                message = (
                    f"instrument {name!r} says nothing for it; give [instruments.{name}] level_mm_per_setup, "
                    "or level_mm_per_sqrt_km and every sight its length"
                )
            self.rows.complain(self.precision_mistakes, int(sections.end[row]), None, message)
        return sd

    def _check_sections(self, marks: IntArray, sections: Sections) -> None:
        for row in np.flatnonzero(marks[:, 0] == marks[:, 1])[:ENOUGH]:
            name = self.marks.names[marks[row, 0]]
            message = (
                f"the section from {name!r} comes back to {name!r} with no mark between; nothing is levelled by it"
            )
            self.rows.complain(self.mistakes, int(sections.end[row]), "point", message)

    def _take_notes(self, sections: Sections) -> None:
        used = self.instruments.of_rows(self.rows)[sections.end]
        known = np.nan_to_num(self.errors.level_collimation[used]) != 0
        lacking = known & np.isnan(sections.imbalance)
        if lacking.any():
            number = counted(int(lacking.sum()), "section")
            self.notes.append(f"{self.rows.table.name}: {number} without sight lengths, collimation not corrected")


def _rows_of(book: StaffRows, sections: Sections) -> tuple[IntArray, IntArray]:
    """The rows that the sections were made of, and the section of each of them; side shots count for themselves."""
    side = ~np.isnan(book.intermediate)
    count = sections.end - sections.start + 1
    section = np.repeat(np.arange(len(count)), count)
    row = np.arange(len(section)) - (np.cumsum(count) - count)[section] + sections.start[section]
    own = ~side[row] | (row == sections.end[section])
    return row[own], section[own]


def _on_model(sd: FloatArray) -> Precision:
    """`sd` (rows,) from the instrument, nothing centred."""
    nothing = np.zeros(len(sd))
    return Precision(np.full(len(sd), np.nan), sd, nothing, nothing, nothing, nothing)
