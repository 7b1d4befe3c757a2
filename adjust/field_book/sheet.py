"""A CSV file cut into cells: separators, quotes, comments and blank lines, a block of rows at a time."""

from __future__ import annotations

import csv
import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import repeat

import numpy as np

from adjust.arrays import IntArray
from adjust.field_book.mistakes import Mistakes

CHUNK = 1_000_000
"""Characters cut at once: enough to be quick, few enough that a million rows never stand in memory as text cells."""

_IDLE_LINE = re.compile(r"""^(?:[^\S\n]*#.*|(?:[^\S\n]|[,;"'])*)$""", re.MULTILINE)
"""A comment, or a line with nothing but separators."""


@dataclass(frozen=True)
class Block:
    """Some rows of a sheet: their line numbers (rows,), and their cells column by column, stripped of spaces."""

    lines: IntArray
    columns: list[list[str]]


class Sheet:
    """The header row of a CSV file and its rows, block by block.

    A file whose header row holds more semicolons than commas is separated by semicolons, and its numbers may have
    decimal commas.
    """

    def __init__(self, file: str, text: str, mistakes: Mistakes) -> None:
        self.file = file
        self.passed_over = False
        """Whether a row could not be cut into the cells of the header row."""
        self._mistakes = mistakes
        plain = text.replace("\r\n", "\n").replace("\r", "\n") if "\r" in text else text
        self._text = plain.rstrip("\n")
        self.header_line, self._start, header = self._find_header()
        self.separator = ";" if header.count(";") > header.count(",") else ","
        self.titles = (self._cells(self.header_line, header) or []) if header else []
        if not header:
            mistakes.add(file, None, None, "is empty, expected a header row and rows below it")
        elif "\t" in header and len(self.titles) == 1:
            message = "the header row is separated by tabs, expected commas or semicolons; save the table as CSV"
            mistakes.add(file, self.header_line, None, message)
            self.titles = []
        self._width = len(self.titles)

    def _find_header(self) -> tuple[int, int, str]:
        """Line number of the first line that is written on, where the next line starts, and the line."""
        line, start = 1, 0
        while start < len(self._text):
            end = self._line_end(start)
            if not _IDLE_LINE.fullmatch(self._text, start, end):
                return line, end + 1, self._text[start:end]
            line, start = line + 1, end + 1
        return 0, start, ""

    def _line_end(self, position: int) -> int:
        end = self._text.find("\n", position)
        return len(self._text) if end < 0 else end

    def blocks(self) -> Iterator[Block]:
        """The rows below the header; a row with a wrong number of cells is noted as a mistake and left out."""
        line, start = self.header_line + 1, self._start
        while start < len(self._text) and not self._mistakes.enough(self.file):
            end = self._line_end(start + CHUNK)
            chunk = self._text[start:end]
            lines = chunk.split("\n")
            numbers = np.arange(line, line + len(lines))
            line, start = line + len(lines), end + 1
            if _IDLE_LINE.search(chunk):
                written = [not _IDLE_LINE.fullmatch(text) for text in lines]
                numbers, lines = numbers[written], [text for text, kept in zip(lines, written, strict=True) if kept]
            if lines:
                yield self._cut(numbers, lines, quoted='"' in chunk)

    def _cut(self, numbers: IntArray, lines: list[str], *, quoted: bool) -> Block:
        """Cut lines at their separators: all at once where they are plain, one by one where that is not enough."""
        width = self._width
        if not quoted and set(map(str.count, lines, repeat(self.separator))) == {width - 1}:
            cells = self.separator.join(lines).split(self.separator)
            return Block(numbers, [list(map(str.strip, cells[column::width])) for column in range(width)])
        rows = [self._row(int(number), line, width) for number, line in zip(numbers, lines, strict=True)]
        kept = [cells for cells in rows if cells is not None]
        columns = [list(column) for column in zip(*kept, strict=True)] or [[] for _ in range(width)]
        return Block(numbers[[cells is not None for cells in rows]], columns)

    def _row(self, number: int, line: str, width: int) -> list[str] | None:
        cells = self._cells(number, line)
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
        if '"' not in line:
            return [cell.strip() for cell in line.split(self.separator)]
        try:
            reader = csv.reader([line], delimiter=self.separator, strict=True, skipinitialspace=True)
            return [cell.strip() for cell in next(reader)]
        except csv.Error:
            self.passed_over = True
            if not self._mistakes.enough(self.file):
                message = "a quoted cell is not closed on its line; close it with a double quotation mark"
                self._mistakes.add(self.file, number, None, message)
            return None
