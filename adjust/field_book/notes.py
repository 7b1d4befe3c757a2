"""What reading decided for the surveyor, in sentences for the listing."""

from __future__ import annotations

import numpy as np

from adjust.field_book.columns import TableRows
from adjust.field_book.mistakes import listed
from adjust.frames import EllipsoidFrame, Frame
from adjust.job import Control, Marks
from adjust.observations import Observations


def note_left_out(left_out: tuple[Observations, ...]) -> list[str]:
    """Rows with `use = no`."""
    labels = [rows.provenance.label(row) for rows in left_out for row in range(len(rows))]
    if not labels:
        return []
    return [f"{counted(len(labels), 'row')} with use = no left out of the adjustment: {listed(labels)}"]


def note_control(marks: Marks, *, inner: bool) -> list[str]:
    """Control that inner constraints do not hold, and sds that no control uses."""
    notes = []
    controlled = np.flatnonzero((marks.control != Control.FREE).any(axis=1))
    if inner and len(controlled):
        notes.append(
            f"inner constraints: the control of {counted(len(controlled), 'mark')} is not held "
            f"({listed(marks.names[row] for row in controlled)})"
        )
    plan = (marks.control[:, 0] != Control.WEIGHTED) & ~np.isnan(marks.sd[:, :2]).all(axis=1)
    height = (marks.control[:, 1] != Control.WEIGHTED) & ~np.isnan(marks.sd[:, 2])
    idle = np.flatnonzero(plan | height)
    if len(idle):
        names = listed(marks.names[row] for row in idle)
        notes.append(f"sds in marks.csv count only for weighted control; those of {names} are not used")
    return notes


def note_frame(frame: Frame, rows: TableRows, *, heights_stated: bool) -> list[str]:
    """What the frame makes of columns and keys."""
    if not isinstance(frame, EllipsoidFrame):
        idle = [name for name in ("geoid", "deflection_north") if not np.isnan(rows.numbers[name]).all()]
        words = {"geoid": "geoid heights", "deflection_north": "deflections of the vertical"}
        return [f"a plane frame does not use {' and '.join(words[name] for name in idle)}"] if idle else []
    if heights_stated or np.isnan(rows.numbers["height"]).all():
        return []
    return ["the job file does not say what heights mean; they are taken as orthometric (above the geoid)"]


def note_unread(files: list[str]) -> list[str]:
    """Tables in the folder that are none of the job's."""
    if not files:
        return []
    return [f"not read, being no table of this job: {listed(files)} (name it in [tables] if it is one)"]


def counted(number: int, noun: str) -> str:
    """`1 row`, `2 rows`."""
    return f"{number} {noun}{'' if number == 1 else 's'}"
