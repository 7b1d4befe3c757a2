"""From cells to arrays: a whole column at once, and cell by cell only to find what is wrong in one that fails."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from functools import partial
from itertools import islice
from typing import cast

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.header import Place, read_header
from adjust.field_book.mistakes import ENOUGH, Mistakes, and_more
from adjust.field_book.schema import Column, Quantity, Table
from adjust.field_book.sheet import Block, Sheet
from adjust.field_book.vocabulary import NO_NAME, Vocabulary
from adjust.observations import Provenance
from adjust.units import parse_angle, parse_angles, parse_length, parse_lengths, parse_number, parse_numbers, shown

Array = FloatArray | IntArray
Complaints = Iterator[tuple[int, str]]
"""Rows of a block and what is wrong with them."""


@dataclass(frozen=True)
class TableRows:
    """The rows of one table from all its files, as columns in metres and radians.

    `numbers` holds every numeric column of the schema, NaN where it or its cell is missing; `indices` every other one:
    places in a vocabulary (−1: blank) or among the choices of the column (blank: the first).
    """

    table: Table
    provenance: Provenance
    numbers: dict[str, FloatArray]
    indices: dict[str, IntArray]
    titles: dict[str, str]
    """The header row's name of each column, for messages."""
    complete: bool
    """Whether every row of the files is here, and names its marks."""

    def __len__(self) -> int:
        return len(self.provenance.line)

    def take(self, rows: BoolArray) -> TableRows:
        """The rows that a mask chooses."""
        return replace(
            self,
            provenance=self.provenance.take(rows),
            numbers={name: values[rows] for name, values in self.numbers.items()},
            indices={name: values[rows] for name, values in self.indices.items()},
        )

    def complain(self, mistakes: Mistakes, row: int, column: str | None, message: str) -> None:
        """Note a mistake of one row."""
        title = None if column is None else self.titles.get(column, self.table.column(column).written)
        place = self.provenance
        mistakes.add(place.files[place.file[row]], int(place.line[row]), title, message)


class FileReader:
    """Reads one file of a table block by block."""

    def __init__(self, sheet: Sheet, table: Table, vocabularies: Mapping[str, Vocabulary], mistakes: Mistakes) -> None:
        self.sheet = sheet
        self.table = table
        self.vocabularies = vocabularies
        self.mistakes = mistakes
        self.places = read_header(sheet, table, mistakes)

    def read(self) -> tuple[IntArray, dict[str, Array]]:
        """Line numbers (rows,) and the columns by name, missing ones filled; mistakes are noted."""
        lines = [np.empty(0, dtype=np.int64)]
        parts = {column.name: [absent(column, 0)] for column in self.table.columns}
        for block in self.sheet.blocks() if self.places else ():
            lines.append(block.lines)
            self._check_untitled(block)
            for column in self.table.columns:
                parts[column.name].append(self._column(column, block))
            if self.mistakes.enough(self.sheet.file):
                break
        if len(lines) == 1 and not self.mistakes.any_in(self.sheet.file):
            message = "has a header row and no rows; fill it in, or take the file away"
            self.mistakes.add(self.sheet.file, None, None, message)
        return np.concatenate(lines), {name: _joined(arrays) for name, arrays in parts.items()}

    def _check_untitled(self, block: Block) -> None:
        """Spreadsheets leave columns without a title and without cells; one with cells has lost its title."""
        for position, title in enumerate(self.sheet.titles):
            filled = [] if title else [row for row, cell in enumerate(block.columns[position]) if cell]
            if filled:
                message = (
                    f"read {shown(block.columns[position][filled[0]])} in column {position + 1}, which has no title"
                )
                self.mistakes.add(self.sheet.file, int(block.lines[filled[0]]), None, f"{message} in the header row")

    @property
    def complete(self) -> bool:
        """Whether the file was read to its end, no row was passed over, and no column of names is missing."""
        named = all(column.name in self.places for column in self.table.columns if column.quantity is Quantity.NAME)
        return named and not self.sheet.passed_over and not self.mistakes.enough(self.sheet.file)

    def _column(self, column: Column, block: Block) -> Array:
        place = self.places.get(column.name)
        if place is None:
            return absent(column, len(block.lines))
        cells = block.columns[place.position]
        values, complaints = self._words(place, cells) if not is_numeric(column) else self._numbers(place, cells)
        for row, message in islice(complaints, ENOUGH):
            self.mistakes.add(self.sheet.file, int(block.lines[row]), place.title, message)
        return values

    def _words(self, place: Place, cells: list[str]) -> tuple[IntArray, Complaints]:
        column = place.column
        if column.quantity is Quantity.CHOICE:
            numbers = {word: number for number, word in enumerate(column.choices)} | {"": 0}
            values = np.array([numbers.get(cell, NO_NAME) for cell in cells], dtype=np.int64)
            return values, ((row, _choice_message(cells[row], column)) for row in rows_where(values < 0))
        vocabulary = self.vocabularies.get(column.name)
        if vocabulary is None:
            return absent(column, len(cells)).astype(np.int64), iter(())
        values = vocabulary.numbers(cells)
        doubtful = rows_where(values == NO_NAME)
        return values, self._name_complaints(place, vocabulary, cells, doubtful)

    @staticmethod
    def _name_complaints(place: Place, vocabulary: Vocabulary, cells: list[str], doubtful: list[int]) -> Complaints:
        """Each unknown name once, on its first row."""
        rows_of: dict[str, list[int]] = {}
        for row in doubtful:
            rows_of.setdefault(cells[row], []).append(row)
        for name, rows in rows_of.items():
            if vocabulary.may_be_unknown(name) if name else not place.column.required:
                continue
            message = vocabulary.complaint(name) if name else "is blank, expected a name"
            yield rows[0], message + and_more(len(rows) - 1)

    def _numbers(self, place: Place, cells: list[str]) -> tuple[FloatArray, Complaints]:
        written = [cell.replace(",", ".") for cell in cells] if self.sheet.separator == ";" else cells
        whole, single = _parsers(place)
        unreadable: dict[int, str] = {}
        try:
            values = whole(written)
        except ValueError:
            values = np.full(len(cells), np.nan)
            unreadable = _read_singly(written, single, values)
        for row, message in unreadable.items():
            unreadable[row] = message.replace(shown(written[row]), shown(cells[row]), 1)
        return values, self._unruly(place, cells, values, unreadable)

    @staticmethod
    def _unruly(place: Place, cells: list[str], values: FloatArray, unreadable: dict[int, str]) -> Complaints:
        """What is wrong with each cell, given what is wrong with those that could not be read."""
        column, blank = place.column, np.isnan(values)
        good: BoolArray = ~blank if column.required else np.ones(len(values), dtype=bool)
        if column.rule is not None:
            good &= blank | column.rule.holds(values)
        good[list(unreadable)] = False
        for row in rows_where(~good):
            if row in unreadable:
                yield row, unreadable[row]
            elif blank[row]:
                yield row, "is blank, expected a value"
            elif column.rule is not None:
                yield row, f"read {shown(cells[row])}, expected {column.rule.expected}"


def _read_singly(cells: list[str], parse: Callable[[str], float], values: FloatArray) -> dict[int, str]:
    """Put what each cell holds into `values` (rows,); return what is wrong with those that cannot be read.

    Stops when enough are found: what comes after them is not shown.
    """
    unreadable: dict[int, str] = {}
    for row, cell in enumerate(cells):
        try:
            values[row] = parse(cell) if cell else np.nan
        except ValueError as error:
            unreadable[row] = str(error)
            if len(unreadable) == ENOUGH:
                break
    return unreadable


def is_numeric(column: Column) -> bool:
    """Whether its cells are numbers, and its array floats."""
    return column.quantity in (Quantity.LENGTH, Quantity.ANGLE, Quantity.NUMBER)


def rows_where(mask: BoolArray) -> list[int]:
    """The rows that a mask (rows,) chooses."""
    chosen: list[int] = np.flatnonzero(mask).tolist()
    return chosen


def _joined(arrays: list[Array]) -> Array:
    return cast(Array, np.concatenate(arrays))


def absent(column: Column, rows: int) -> Array:
    """What stands for a column that a file does not have."""
    if is_numeric(column):
        return np.full(rows, np.nan)
    return np.full(rows, 0 if column.quantity is Quantity.CHOICE else NO_NAME, dtype=np.int64)


def _choice_message(cell: str, column: Column) -> str:
    return f"read {shown(cell)}, expected {' or '.join(repr(word) for word in column.choices)}"


def _parsers(place: Place) -> tuple[Callable[[list[str]], FloatArray], Callable[[str], float]]:
    """How to read a whole column, and one cell of it."""
    if place.column.quantity is Quantity.LENGTH:
        return partial(parse_lengths, ending=place.ending), partial(parse_length, ending=place.ending)
    if place.column.quantity is Quantity.ANGLE:
        return partial(parse_angles, ending=place.ending), partial(parse_angle, ending=place.ending)
    return parse_numbers, parse_number


def plain_sheet(file: str, text: str, table: Table, mistakes: Mistakes) -> Sheet:
    """A file as it is written."""
    return Sheet(file, text, mistakes)


def read_table(
    table: Table,
    texts: Mapping[str, str],
    vocabularies: Mapping[str, Vocabulary],
    mistakes: Mistakes,
    sheet_of: Callable[[str, str, Table, Mistakes], Sheet] = plain_sheet,
) -> TableRows:
    """All files of a table (`texts`: their contents by name) as one. Mistakes are noted, not raised.

    A column that has no entry in `vocabularies` although it holds text is ignored. `sheet_of` cuts a file into cells.
    """
    sheets = [sheet_of(file, text, table, mistakes) for file, text in texts.items()]
    readers = [FileReader(sheet, table, vocabularies, mistakes) for sheet in sheets]
    read = [reader.read() for reader in readers]
    joined = {column.name: np.concatenate([values[column.name] for _, values in read]) for column in table.columns}
    file = np.repeat(np.arange(len(read)), [len(lines) for lines, _ in read])
    provenance = Provenance(tuple(texts), file, np.concatenate([lines for lines, _ in read]))
    numeric = {column.name for column in table.columns if is_numeric(column)}
    titles = {name: place.title for reader in readers for name, place in reader.places.items()}
    return TableRows(
        table,
        provenance,
        {name: values.astype(np.float64) for name, values in joined.items() if name in numeric},
        {name: values.astype(np.int64) for name, values in joined.items() if name not in numeric},
        titles,
        complete=all(reader.complete for reader in readers),
    )
