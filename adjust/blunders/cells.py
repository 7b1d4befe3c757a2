"""The cells that a suspect was written in: from the job folder, or as a book would have them."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from adjust.blunders.hypothesis import Hypothesis
from adjust.field_book.cells import Style, Table
from adjust.field_book.decided_sheet import BLANK
from adjust.field_book.schema import AXES, TABLES
from adjust.field_book.writing import VALUE_COLUMNS
from adjust.field_book.written import Cell, Line, written
from adjust.job import Job
from adjust.observations import Observations, Provenance, SlopeDistances, Vectors, ZenithAngles

TENTH_OF_A_MILLIMETRE = 4
"""Decimals of a metre that total stations and levels show: common practice, no source."""
TENTH_OF_A_SECOND = 1
"""Decimals of a second that they show: common practice, no source."""
CENTIMETRE_ON_EARTH = 4
"""Decimals of a second of latitude, 3 mm on the ground, the last digit of most lists: common practice, no source."""


def cells_of(job: Job, hypotheses: Sequence[Hypothesis], folder: str | Path | None = None) -> list[tuple[Line, ...]]:
    """For each hypothesis the cells of its lines: one line, or all that a mean was made of.

    Of a group it is the first line; of a mark's control the mark's line. Lines that `folder` does not have, and all
    lines without a folder, are written as a book would have them.
    """
    sources = [_lines(job, hypothesis) for hypothesis in hypotheses]
    found = written(folder, (line for lines in sources for line in lines)) if folder is not None else {}
    found = {line: _as_decided(job, line, cells) for line, cells in found.items()}
    return [
        tuple(found[line] for line in lines)
        if all(line in found for line in lines)
        else (_as_written(job, hypothesis),)
        for lines, hypothesis in zip(sources, hypotheses, strict=True)
    ]


def _as_decided(job: Job, line: tuple[str, int], cells: Line) -> Line:
    """The cells of a line with what the surveyor corrected in it."""
    decided = dict(cells)
    for each in job.decisions:
        if each.decision == "correct" and each.source == f"{line[0]}:{line[1]}":
            decided[_plain(each.column)] = Cell(each.column, "" if each.value == BLANK else each.value)
    return {name: cell for name, cell in decided.items() if cell.text}


def _plain(title: str) -> str:
    """The plain name of a column by its title: `target_height` of `target_height_m`."""
    return next(column.name for table in TABLES.values() for column in table.columns if title in column.titles)


def _lines(job: Job, hypothesis: Hypothesis) -> list[tuple[str, int]]:
    """File and number of each line."""
    provenance, row = _place(job, hypothesis)
    further = () if provenance.further is None else provenance.further[row]
    return [(provenance.files[provenance.file[row]], int(line)) for line in (provenance.line[row], *further)]


def _place(job: Job, hypothesis: Hypothesis) -> tuple[Provenance, int]:
    if hypothesis.nature == "control" and hypothesis.mark is not None:
        return job.marks.provenance, hypothesis.mark
    kind, rows = hypothesis.rows[0]
    return job.observations[kind].provenance, int(rows[0])


def _as_written(job: Job, hypothesis: Hypothesis) -> Line:
    """What a book would hold, printed to what instruments show."""
    if hypothesis.nature == "control" and hypothesis.mark is not None:
        return _mark_as_written(job, hypothesis.mark)
    kind, rows = hypothesis.rows[0]
    return row_as_written(job, job.observations[kind].take(rows[:1]))


def row_as_written(job: Job, row: Observations) -> Line:
    """The cells of a single row (take one row of a kind), lengths in metres and angles in degrees, minutes, seconds."""
    if row.kind == "control":
        return _mark_as_written(job, int(row.marks[0, 0]))
    cells = {role: Cell(role, job.marks.names[row.marks[0, place]]) for place, role in enumerate(row.roles)}
    names = [f"d{axis}" for axis in AXES] if isinstance(row, Vectors) else [VALUE_COLUMNS[row.kind]]
    columns = dict(zip(names, row.observed.T, strict=True))
    if isinstance(row, SlopeDistances | ZenithAngles):
        heights = dict(zip(("instrument_height", "target_height"), row.heights.T, strict=True))
        columns |= {name: height for name, height in heights.items() if height[0] != 0.0}
    decimals = dict.fromkeys(columns, TENTH_OF_A_MILLIMETRE if row.unit == "m" else TENTH_OF_A_SECOND)
    style = Style(decimals | {"instrument_height": 3, "target_height": 3}, sexagesimal=True)
    for name, value in columns.items():
        angular = row.unit == "rad" and name in names
        cells[name] = _cell(style.angle(name, value) if angular else style.length(name, value))
    return cells


def _mark_as_written(job: Job, mark: int) -> Line:
    given = job.marks.given[mark : mark + 1]
    style = Style(
        dict.fromkeys(("easting", "northing", "height"), TENTH_OF_A_MILLIMETRE)
        | dict.fromkeys(("latitude", "longitude"), CENTIMETRE_ON_EARTH),
        sexagesimal=True,
    )
    easting, northing = job.frame.grid_coordinates(given).T
    if np.isnan(easting[0]):
        plan = {"latitude": style.angle("latitude", given[:, 1]), "longitude": style.angle("longitude", given[:, 0])}
    else:
        plan = {"easting": style.length("easting", easting), "northing": style.length("northing", northing)}
    columns = plan | {"height": style.length("height", given[:, 2])}
    cells = {name: _cell(table) for name, table in columns.items()}
    return {"mark": Cell("mark", job.marks.names[mark])} | {name: cell for name, cell in cells.items() if cell.text}


def _cell(table: Table) -> Cell:
    """The one cell of a table of one row and one column."""
    ((title, (text,)),) = table.items()
    return Cell(title, text)
