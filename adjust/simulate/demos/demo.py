"""What the demonstrations have in common."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.cells import Table
from adjust.field_book.writing import JobFolder
from adjust.job import Job, Marks


@dataclass(frozen=True)
class Demo:
    """A job folder with a page that tells its story."""

    folder: JobFolder
    comments: Mapping[str, Sequence[str]]
    """Lines above the header row, by table."""
    readme: str

    def write(self, folder: Path) -> None:
        """Write the job folder and its README.md."""
        self.folder.write(folder, self.comments)
        (folder / "README.md").write_text(self.readme, encoding="utf-8", newline="\n")


def named(marks: Marks, names: Sequence[str], descriptions: Sequence[str]) -> Marks:
    """The marks under other names."""
    return replace(marks, names=tuple(names), descriptions=tuple(descriptions))


def numbers_of(pairs: Sequence[tuple[str, ...]], names: Sequence[str]) -> IntArray:
    """Rows of mark names as rows of their numbers."""
    number = {name: index for index, name in enumerate(names)}
    return np.array([[number[name] for name in pair] for pair in pairs], dtype=np.int64)


def occupations(job: Job) -> tuple[str, ...]:
    """Names for the setups of a job: the order in which the party moved on."""
    return tuple(f"S{number}" for number in range(1, len(job.setups) + 1))


def noted(table: Table, notes: Mapping[int, str]) -> Table:
    """The table with a column of notes, by row."""
    rows = len(next(iter(table.values())))
    return table | {"note": [notes.get(row, "") for row in range(rows)]}


def with_lengths(levels: Table, kilometres: FloatArray) -> Table:
    """A table of levels that gives the length of each line in place of its sd: the instrument speaks for it."""
    kept = {title: cells for title, cells in levels.items() if title != "sd_mm"}
    return kept | {"length_km": [f"{length:.2f}" for length in kilometres.tolist()]}


def rows_of(table: Table, rows: slice) -> Table:
    """Some rows of a table."""
    return {title: cells[rows] for title, cells in table.items()}
