"""One file of the field book as it reads with the surveyor's decisions: the file itself is never written to."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from adjust.errors import Mistake
from adjust.field_book.mistakes import Likeness, Mistakes
from adjust.field_book.schema import Column, Quantity, Table
from adjust.field_book.sheet import Block, Sheet
from adjust.job import Decision
from adjust.units import parse_angle, parse_length, parse_number, shown

USE = "use"
BLANK = "(blank)"
"""What a correction gives as value to empty a cell."""

OBSERVED = {
    "marks": ("easting", "northing", "latitude", "longitude", "height"),
    "directions": ("direction",),
    "angles": ("angle",),
    "azimuths": ("azimuth",),
    "distances": ("slope", "horizontal"),
    "zeniths": ("zenith",),
    "levels": ("rise",),
    "vectors": ("dx", "dy", "dz"),
    "pointings": ("circle", "zenith", "slope"),
    "level_book": ("backsight", "intermediate", "foresight"),
}
"""The columns of each table that hold what was observed: where a line fills one of them, it need not be named."""

SAME = 1e-9
"""Relative difference below which two writings are the same number: a spreadsheet drops trailing zeros."""


@dataclass(frozen=True)
class Ruling:
    """One row of the table of decisions: `file` and `number` name the line of the book that `decision` is on."""

    line: int
    """Of the table of decisions."""
    file: str
    number: int
    decision: Decision


class DecidedSheet(Sheet):
    """A sheet whose decided lines read as decided. What is wrong with a ruling is noted under `own`, the table's name.

    A column that a ruling names and the file lacks is added, blank in every other row.
    """

    def __init__(
        self, file: str, text: str, mistakes: Mistakes, table: Table, rulings: Sequence[Ruling], own: str
    ) -> None:
        super().__init__(file, text, mistakes)
        self._table, self._own = table, own
        self._column_of = {title: column for column in table.columns for title in column.titles}
        self._rulings: dict[int, list[Ruling]] = {}
        for ruling in rulings:
            self._rulings.setdefault(ruling.number, []).append(ruling)
        self.taken: dict[int, Decision] = {}
        """Decisions as they were carried out, by their line in the table of decisions."""
        self.lines = (0, 0)
        """The first and the last line that holds a row, once all are read."""
        self._add_titles(rulings)

    def _complain(self, ruling: Ruling, column: str, message: str) -> None:
        self._mistakes.add(self._own, ruling.line, column, message)

    def _add_titles(self, rulings: Sequence[Ruling]) -> None:
        """Titles that the header row lacks: those of corrected blank cells, and the one that leaves rows out."""
        for ruling in rulings if self.titles else ():
            decision = ruling.decision
            refusal = self._refusal(decision.column) if decision.column else ""
            if refusal:
                self._complain(ruling, "column", refusal)
            elif decision.decision == "correct":
                self._add(decision.column)
            if decision.decision == "leave_out" and USE in self._column_of:
                self._add(USE)
            elif decision.decision == "leave_out":
                self._complain(ruling, "decision", _NO_MARK_LEFT_OUT)

    def _add(self, title: str) -> None:
        if title and title not in self.titles:
            self.titles = [*self.titles, title]

    def _refusal(self, title: str) -> str:
        """Why a column cannot be decided on; blank where it can."""
        column = self._column_of.get(title)
        if column is None:
            return self._unknown(title)
        there = [written for written in self.titles if self._column_of.get(written) is column]
        if there and title not in there:
            return f"read {shown(title)}, but {self.file} has it as '{there[0]}'; write that, and the value in its unit"
        return ""

    def _unknown(self, title: str) -> str:
        known = [written for written in self.titles if written in self._column_of]
        guess = Likeness(known).suggestion(title) or Likeness(self._column_of).suggestion(title)
        expected = guess or f"; it has {', '.join(repr(written) for written in known)}"
        return f"read {shown(title)}, which is no column of {self.file}{expected}"

    def blocks(self) -> Iterator[Block]:
        """The rows below the header, decided ones as decided."""
        for block in super().blocks():
            if len(block.lines):
                self.lines = (self.lines[0] or int(block.lines[0]), int(block.lines[-1]))
            columns = [*block.columns, *([""] * len(block.lines) for _ in self.titles[len(block.columns) :])]
            decided = replace(block, columns=columns)
            for row, number in enumerate(block.lines.tolist() if self._rulings else ()):
                for ruling in self._rulings.get(number, ()):
                    self._carry_out(ruling, decided, row)
            yield decided

    def _carry_out(self, ruling: Ruling, block: Block, row: int) -> None:
        decision = ruling.decision
        column = decision.column or self._only_observed(ruling, block, row)
        for line in self._earlier(ruling, column):
            message = f"{decision.source} is decided on line {line} already; keep one of the two rows"
            self._complain(ruling, "source", message)
        self.taken[ruling.line] = replace(decision, column=column)
        if column in self.titles:
            cells = block.columns[self.titles.index(column)]
            self.taken[ruling.line] = replace(decision, column=column, written=cells[row])
            if not self._as_decided(decision, column, cells[row]):
                self._complain(ruling, "written", self._moved(ruling, cells[row]))
            elif decision.decision == "correct":
                cells[row] = "" if decision.value == BLANK else decision.value
        if decision.decision == "leave_out" and USE in self.titles:
            block.columns[self.titles.index(USE)][row] = "no"

    def _earlier(self, ruling: Ruling, column: str) -> Iterator[int]:
        """Lines of the table that decided on the same cell under another name: one left it blank."""
        for each in self._rulings[ruling.number]:
            taken = self.taken.get(each.line)
            if taken and column and taken.column == column and each.decision.column != ruling.decision.column:
                yield each.line

    def _only_observed(self, ruling: Ruling, block: Block, row: int) -> str:
        """The title of the observed value of a line that has only one; blank where a correction has to say which."""
        names = OBSERVED[self._table.name]
        titles = [
            title
            for place, title in enumerate(self.titles)
            if (column := self._column_of.get(title)) and column.name in names and block.columns[place][row]
        ]
        if len(titles) != 1 and ruling.decision.decision == "correct":
            values = " or ".join(f"'{title}'" for title in titles)
            message = f"is blank; {ruling.decision.source} has {len(titles)} observed values; write which one"
            self._complain(ruling, "column", f"{message}: {values}" if values else message)
        return titles[0] if len(titles) == 1 else ""

    @staticmethod
    def _moved(ruling: Ruling, there: str) -> str:
        return (
            f"read {shown(ruling.decision.written)}, but {ruling.decision.source} holds {shown(there)} now: the book "
            "was changed, or its lines moved; decide again, or take the row away"
        )

    def _as_decided(self, decision: Decision, title: str, there: str) -> bool:
        """Whether a cell still holds what was decided on: the same text, or the same number written otherwise."""
        first, second = decision.written, there
        if decision.decision == "keep" or first in ("", second):
            return True
        try:
            one, other = (_number(self._column_of[title], title, text.replace(",", ".")) for text in (first, second))
        except (ValueError, KeyError):
            return False
        return abs(one - other) <= SAME * max(abs(one), abs(other))

    def blamed(self, mistake: Mistake, own: str) -> Mistake:
        """A mistake that a ruling made, put where it can be mended: in the table of decisions."""
        for ruling in self._rulings.get(mistake.line or 0, ()):
            taken = self.taken.get(ruling.line)
            if taken is not None and taken.decision == "correct":
                if mistake.column == taken.column:
                    return Mistake(own, ruling.line, "value", f"{mistake.message} (for {taken.source}, {taken.column})")
                return replace(mistake, message=f"{mistake.message} (with what {own}:{ruling.line} corrects)")
        return mistake


_NO_MARK_LEFT_OUT = (
    "a mark is not left out; to hold its coordinates no longer, write 'correct', the column plan_control or "
    "height_control, and the value free"
)


def _number(column: Column, title: str, text: str) -> float:
    """What a cell says, metres or radians. Raises ValueError where it is no number."""
    ending = title.removeprefix(column.name).removeprefix("_")
    if column.quantity is Quantity.LENGTH:
        return parse_length(text, ending)
    return parse_angle(text, ending) if column.quantity is Quantity.ANGLE else parse_number(text)
