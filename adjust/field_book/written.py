"""What stands in the book: the cells of single lines, read again from the job folder when somebody asks for them."""

from __future__ import annotations

import posixpath
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path

from adjust.errors import HubtackError
from adjust.field_book.folder import Folder, open_folder
from adjust.field_book.header import Place, read_header
from adjust.field_book.job_file import JobFileReader
from adjust.field_book.mistakes import Mistakes
from adjust.field_book.schema import TABLES, Table
from adjust.field_book.sheet import Sheet


@dataclass(frozen=True)
class Cell:
    """One cell of the field book: the column's title with its unit, `direction_dms`, and what stands in it."""

    title: str
    text: str


Line = Mapping[str, Cell]
"""Cells of one line by the plain name of their column: `direction`, `to`, `target_height`."""


def written(job: str | Path, lines: Iterable[tuple[str, int]]) -> dict[tuple[str, int], Line]:
    """The cells of `lines` (file and line number) of a job that was read before, by its folder or its `job.toml`.

    A line that is not there any more, or cannot be read, is left out: the file may have changed since.
    """
    wanted: dict[str, list[int]] = {}
    for file, number in lines:
        wanted.setdefault(file, []).append(number)
    try:
        folder = open_folder(job, Mistakes())
    except HubtackError:
        return {}
    tables = _tables(folder)
    return {
        (file, number): cells
        for file, numbers in wanted.items()
        if file in tables
        for number, cells in _lines(folder, file, tables[file], numbers)
    }


def separator(job: str | Path, file: str) -> str:
    """What separates the cells of a file of a job: a comma where it cannot be read any more."""
    try:
        text = open_folder(job, Mistakes()).text(file)
    except HubtackError:
        text = None
    return "," if text is None else Sheet(file, text, Mistakes()).separator


def _tables(folder: Folder) -> dict[str, Table]:
    """The table that each file of a job holds."""
    text = folder.text(folder.job_file)
    job_file = JobFileReader(folder.job_file, text or "", Mistakes()).read()
    named = job_file.tables if job_file is not None else {}
    usual = {f"{name}.csv": table for name, table in TABLES.items() if name not in named}
    return usual | {posixpath.normpath(file): TABLES[name] for name, files in named.items() for file in files}


def _lines(folder: Folder, file: str, table: Table, numbers: list[int]) -> Iterable[tuple[int, Line]]:
    text = folder.text(file)
    if text is None:
        return
    every = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    sheet = Sheet(file, text, Mistakes())
    places = read_header(sheet, table, Mistakes())
    header = every[sheet.header_line - 1]
    for number in numbers:
        if sheet.header_line < number <= len(every):
            cells = _cells(file, f"{header}\n{every[number - 1]}", places)
            if cells:
                yield number, cells


def _cells(file: str, text: str, places: Mapping[str, Place]) -> Line:
    """The filled cells of the one line below a header row."""
    for block in Sheet(file, text, Mistakes()).blocks():
        if len(block.lines):
            filled = ((name, place.title, block.columns[place.position][0]) for name, place in places.items())
            return {name: Cell(title, cell) for name, title, cell in filled if cell}
    return {}
