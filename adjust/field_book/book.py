"""The tables of a job: which files hold them, and their rows with names resolved to numbers."""

from __future__ import annotations

import posixpath
from dataclasses import dataclass

from adjust.field_book.columns import TableRows, read_table
from adjust.field_book.decisions import Decisions
from adjust.field_book.folder import Folder
from adjust.field_book.job_file import JobFile, JobFileReader
from adjust.field_book.mistakes import Mistakes, listed
from adjust.field_book.schema import FACES, MARKS, TABLES, Table
from adjust.field_book.vocabulary import StaffPoints, Vocabulary

OBSERVATION_TABLES = tuple(table for table in TABLES.values() if table is not MARKS)


@dataclass(frozen=True)
class Book:
    """The tables of a job as read.

    `mark_names` numbers the marks of `marks`, `names` those that observations name, `setups` the setups of directions
    and pointings, `lines` the lines of level books, `groups` the groups that rows are put into.
    """

    marks: TableRows
    mark_names: Vocabulary
    descriptions: Vocabulary
    observations: tuple[TableRows, ...]
    names: Vocabulary
    setups: Vocabulary
    lines: Vocabulary
    groups: Vocabulary


class BookReader:
    """Finds and reads the tables of a job, noting mistakes."""

    def __init__(
        self,
        folder: Folder,
        job_file: JobFile,
        reader: JobFileReader,
        mistakes: Mistakes,
        decisions: Decisions,
    ) -> None:
        self.decisions = decisions
        self.folder = folder
        self.job_file = job_file
        self.reader = reader
        self.mistakes = mistakes
        self._table_of: dict[str, str] = {}

    @property
    def files(self) -> tuple[str, ...]:
        """The files that some table was read from so far."""
        return tuple(self._table_of)

    def read(self) -> Book:
        """All tables. Raises FieldDataError where there is no table of marks."""
        mark_names, descriptions = Vocabulary("a mark"), Vocabulary("a description")
        marks = self._table(MARKS, {"mark": mark_names, "description": descriptions})
        whole = marks is not None and marks.complete
        listing = listed(file for file, name in self._table_of.items() if name == MARKS.name)
        names = Vocabulary(f"a mark of {listing}", mark_names.names if whole else None)
        setups, lines, groups = Vocabulary("a setup"), Vocabulary("a line"), Vocabulary("a group")
        words = dict.fromkeys(("at", "from", "to"), names) | {
            "setup": setups,
            "instrument": Vocabulary("an instrument of the job file", self.job_file.instruments),
            "target": Vocabulary("a target of the job file", self.job_file.targets),
            "round": Vocabulary("a round"),
            "face": Vocabulary("a face, L or R", FACES),
            "line": lines,
            "group": groups,
            "point": StaffPoints(names.described, names.names if whole else None),
        }
        read = [self._table(table, words) for table in OBSERVATION_TABLES]
        self._complain_of_absent_tables()
        if marks is None:
            self.mistakes.raise_if_any()
            raise AssertionError("a missing table of marks leaves a mistake behind")
        tables = tuple(rows for rows in read if rows is not None)
        return Book(marks, mark_names, descriptions, tables, names, setups, lines, groups)

    def _complain_of_absent_tables(self) -> None:
        tables = set(self._table_of.values())
        if MARKS.name not in tables and MARKS.name not in self.job_file.tables:
            message = "there is no such file; every job needs a table that lists its marks"
            self.mistakes.add("marks.csv", None, None, message)
        if not (tables | self.job_file.tables.keys()) - {MARKS.name}:
            expected = ", ".join(f"{table.name}.csv" for table in OBSERVATION_TABLES)
            message = f"the job has no observations; write one of {expected}, or name files in [tables]"
            self.mistakes.add(self.reader.name, None, None, message)

    def _table(self, table: Table, words: dict[str, Vocabulary]) -> TableRows | None:
        """The rows of one table, or None where it has no file that can be read."""
        found = ((file, self.folder.text(file)) for file in self._files(table))
        texts = {file: text for file, text in found if text is not None}
        return read_table(table, texts, words, self.mistakes, self.decisions.sheet) if texts else None

    def _files(self, table: Table) -> list[str]:
        """The files of a table: those that the job file names, or the one of its own name where there is one."""
        usual = f"{table.name}.csv"
        named = self.job_file.tables.get(table.name)
        if named is None:
            named = [usual] if self.folder.has(usual) else []
        return [posixpath.normpath(file) for file in named if self._is_new(file, table)]

    def _is_new(self, file: str, table: Table) -> bool:
        """Whether a file is there and not read for another table yet."""
        name = posixpath.normpath(file)
        if not self.folder.has(name):
            message = f"read {file!r}, but the job folder has no such file; mend the name, or put the file there"
        elif name in self._table_of:
            message = f"{file!r} is read for {self._table_of[name]} already; name each file once"
        else:
            self._table_of[name] = table.name
            return True
        self.reader.complain(("tables", table.name), message)
        return False
