"""The table of decisions: what the surveyor makes of single lines of the book, applied while the book is read."""

from __future__ import annotations

import posixpath
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Literal, cast

from adjust.errors import Mistake
from adjust.field_book.columns import TableRows, read_table
from adjust.field_book.decided_sheet import DecidedSheet, Ruling
from adjust.field_book.folder import Folder
from adjust.field_book.mistakes import Likeness, Mistakes, listed
from adjust.field_book.schema import Column, Quantity, Table
from adjust.field_book.sheet import Sheet
from adjust.field_book.vocabulary import Vocabulary
from adjust.job import Decision
from adjust.units import shown

CHOICES: tuple[Literal["keep", "leave_out", "correct"], ...] = ("keep", "leave_out", "correct")

DECISIONS = Table(
    "decisions",
    "a decision on one line of the field book",
    (
        Column("source", Quantity.NAME, "file and line, `distances.csv:13`", required=True),
        Column(
            "decision",
            Quantity.CHOICE,
            "`leave_out` does as `use = no` in the book, `correct` as if the book held `value`",
            choices=CHOICES,
        ),
        Column("column", Quantity.TEXT, "title of the column to correct; blank: the line's one observed value"),
        Column("value", Quantity.TEXT, "what the column should hold, as the book writes it; `(blank)` for nothing"),
        Column("reason", Quantity.TEXT, "why; needed wherever the book is not kept"),
        Column(
            "written", Quantity.TEXT, "what the book held when it was decided; refused where it holds something else"
        ),
        Column("proposal", Quantity.TEXT, "the `value` that was proposed, which stands for nothing while it is kept"),
    ),
)

_SOURCE = re.compile(r"(.+):([0-9]+)((?:\+[0-9]+)*)")


class Decisions:
    """The rulings of one table of decisions, and what became of them in the files of the book; none where nothing is
    decided."""

    def __init__(self, mistakes: Mistakes, name: str = "", rulings: tuple[Ruling, ...] = ()) -> None:
        self.name = name
        self.rulings = rulings
        self._mistakes = mistakes
        self._sheets: dict[str, DecidedSheet] = {}

    def sheet(self, file: str, text: str, table: Table, mistakes: Mistakes) -> Sheet:
        """A file of the book as it reads with the rulings on it."""
        rulings = [ruling for ruling in self.rulings if ruling.file == file]
        self._sheets[file] = DecidedSheet(file, text, mistakes, table, rulings, self.name)
        return self._sheets[file]

    def check_sources(self) -> None:
        """Once all files are read: note rulings on files and lines that the book does not have."""
        for ruling in self.rulings:
            sheet, source = self._sheets.get(ruling.file), shown(ruling.decision.source)
            if sheet is None:
                guess = Likeness(self._sheets).suggestion(ruling.file) or f"; the job reads {listed(self._sheets)}"
                message = f"read {source}, but the job has no table {shown(ruling.file)}{guess}"
            elif ruling.line not in sheet.taken and not self._mistakes.any_in(ruling.file):
                first, last = sheet.lines
                message = (
                    f"read {source}, but no row stands there; those of {ruling.file} are on lines {first} to {last}"
                )
            else:
                continue
            self._mistakes.add(self.name, ruling.line, "source", message)

    @property
    def taken(self) -> tuple[Decision, ...]:
        """All decisions as they were carried out, in the order of their table."""
        taken = {line: decision for sheet in self._sheets.values() for line, decision in sheet.taken.items()}
        return tuple(taken[ruling.line] for ruling in self.rulings if ruling.line in taken)

    def blamed(self, mistake: Mistake) -> Mistake:
        """A mistake in the book that a ruling made, put where it can be mended; any other as it is."""
        sheet = self._sheets.get(mistake.file)
        return mistake if sheet is None else sheet.blamed(mistake, self.name)


def read_decisions(path: str | Path, folder: Folder, mistakes: Mistakes) -> Decisions:
    """The decisions in a file; mistakes are noted, not raised."""
    name, text = str(path), folder.text_of_another(Path(path))
    if text is None:
        return Decisions(mistakes, name)
    words = {column.name: Vocabulary(column.name) for column in DECISIONS.columns}
    rows = read_table(DECISIONS, {name: text}, words, mistakes)
    if mistakes.any_in(name):
        return Decisions(mistakes, name)
    rulings = tuple(_rulings(rows, {name: (*word.names, "") for name, word in words.items()}, mistakes))
    _check_twice(rulings, name, mistakes)
    return Decisions(mistakes, name, rulings)


def _rulings(rows: TableRows, words: dict[str, tuple[str, ...]], mistakes: Mistakes) -> Iterator[Ruling]:
    """The rows that can be understood, after noting what is wrong with each."""
    for row, line in enumerate(rows.provenance.line.tolist()):
        cells = {name: words[name][rows.indices[name][row]] for name in words if name != "decision"}
        decision = CHOICES[rows.indices["decision"][row]]
        found = list(_faults(decision, cells))
        for column, message in found:
            rows.complain(mistakes, row, column, message)
        if not found:
            place = cast(re.Match[str], _SOURCE.fullmatch(cells["source"]))
            value = cells["value"] if decision == "correct" else ""
            ruling = Decision(cells["source"], decision, cells["column"], cells["written"], value, cells["reason"])
            yield Ruling(line, posixpath.normpath(place[1]), int(place[2]), ruling)


def _faults(decision: str, cells: dict[str, str]) -> Iterator[tuple[str, str]]:
    """Columns of one row and what is wrong there."""
    source, value = cells["source"], cells["value"]
    place = _SOURCE.fullmatch(source)
    if place is None:
        yield "source", f"read {shown(source)}, expected file and line, as in distances.csv:13"
    elif place[3]:
        lines = listed(f"{place[1]}:{line}" for line in f"{place[2]}{place[3]}".split("+"))
        yield "source", f"read {shown(source)}, a mean of several readings; decide on each line: {lines}"
    if decision == "correct" and not value:
        yield "value", "is blank; a correction needs the value that the book should hold ((blank) for an empty cell)"
    if decision != "correct" and value and value != cells["proposal"]:
        yield "value", f"read {shown(value)}, but the decision is {decision}; write 'correct', or empty the cell"
    if decision != "keep" and not cells["reason"]:
        yield "reason", f"is blank; write why this line is {_DONE[decision]}: it stands in every report"


_DONE = {"leave_out": "left out", "correct": "corrected"}


def _check_twice(rulings: tuple[Ruling, ...], name: str, mistakes: Mistakes) -> None:
    """Note lines decided twice: the same column again, or left out and decided otherwise."""
    earlier: dict[tuple[str, int, str], int] = {}
    left_out = {(each.file, each.number): each for each in rulings if each.decision.decision == "leave_out"}
    for ruling in rulings:
        decision = ruling.decision
        key = (ruling.file, ruling.number, decision.column)
        other = left_out.get(key[:2])
        if key in earlier:
            message = f"{decision.source} is decided on line {earlier[key]} already; keep one of the two rows"
            mistakes.add(name, ruling.line, "source", message)
        elif other is not None and other is not ruling and decision.decision != "keep":
            message = f"{decision.source} is left out on line {other.line}; keep one of the two rows"
            mistakes.add(name, ruling.line, "source", message)
        earlier.setdefault(key, ruling.line)
