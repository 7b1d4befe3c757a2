"""A CSV file cut into cells: separators, quotes, comments and blank lines, a block of rows at a time."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice

from adjust.field_book.mistakes import Mistakes

BLOCK = 65_536
"""Lines cut at once: enough to be quick, few enough that a million rows never stand in memory as text cells."""

Line = tuple[int, str]


@dataclass(frozen=True)
class Block:
    """Some rows of a sheet: their line numbers, and their cells column by column, stripped of spaces."""

    lines: list[int]
    columns: list[list[str]]


class Sheet:
    """The header row of a CSV file and, once, its blocks of rows.

    A file whose header row holds a semicolon is separated by semicolons, and its numbers may have decimal commas.
    """

    def __init__(self, file: str, text: str, mistakes: Mistakes) -> None:
        self.file = file
        self.passed_over = False
        """Whether a row could not be cut into the cells of the header row."""
        self._mistakes = mistakes
        self._lines = self._written_lines(text)
        self.header_line, header = next(self._lines, (0, ""))
        self.separator = ";" if ";" in header else ","
        self.titles = self._cells(self.header_line, header) or []
        if not self.header_line:
            mistakes.add(file, None, None, "is empty, expected a header row and rows below it")
        elif "\t" in header and len(self.titles) == 1:
            message = "the header row is separated by tabs, expected commas or semicolons; save the table as CSV"
            mistakes.add(file, self.header_line, None, message)
            self.titles = []

    @staticmethod
    def _written_lines(text: str) -> Iterator[Line]:
        for number, line in enumerate(io.StringIO(text, newline=None), 1):
            if line.strip(" \t\n,;\"'") and not line.lstrip().startswith("#"):
                yield number, line

    def blocks(self) -> Iterator[Block]:
        """The rows below the header; a row with a wrong number of cells is noted as a mistake and left out."""
        width = len(self.titles)
        while chunk := list(islice(self._lines, BLOCK)):
            rows = [(number, cells) for number, line in chunk if (cells := self._row(number, line, width))]
            if rows:
                columns = [list(map(str.strip, column)) for column in zip(*(cells for _, cells in rows), strict=True)]
                yield Block([number for number, _ in rows], columns)
            if self._mistakes.enough(self.file):
                return

    def _row(self, number: int, line: str, width: int) -> list[str] | None:
        cells = line.split(self.separator) if '"' not in line else self._cells(number, line)
        if cells is None or len(cells) == width:
            return cells
        if len(cells) > width and not any(map(str.strip, cells[width:])):
            return cells[:width]
        self.passed_over = True
        if not self._mistakes.enough(self.file):
            message = f"read {len(cells)} cells, expected {width} as in the header row; count the separators"
            if self.separator == "," and len(cells) > width:
                message += " (decimal commas need a file separated by semicolons)"
            self._mistakes.add(self.file, number, None, message)
        return None

    def _cells(self, number: int, line: str) -> list[str] | None:
        """Cut one line, with quoted cells; a quoted cell ends on its line."""
        try:
            reader = csv.reader([line.rstrip("\n")], delimiter=self.separator, strict=True, skipinitialspace=True)
            return [cell.strip() for cell in next(reader)]
        except csv.Error:
            self.passed_over = True
            if not self._mistakes.enough(self.file):
                message = "a quoted cell is not closed on its line; close it with a double quotation mark"
                self._mistakes.add(self.file, number, None, message)
            return None
