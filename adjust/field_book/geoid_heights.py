"""Whether the job knows the geoid where its observations need it."""

from __future__ import annotations

import numpy as np

from adjust.arrays import BoolArray
from adjust.field_book.columns import TableRows
from adjust.field_book.mistakes import ENOUGH, Mistakes, listed
from adjust.frames import Frame
from adjust.job import Marks
from adjust.observations import Observations


def marks_that_need_geoid(
    frame: Frame, orthometric: bool, marks: Marks, observations: tuple[Observations, ...]
) -> BoolArray:
    """Marks (n,) whose geoid height enters the adjustment.

    With orthometric heights, those of every observation but levelling, which is orthometric already; with ellipsoidal
    heights, those that are levelled.
    """
    needed = np.zeros(len(marks), dtype=bool)
    if frame.kind == "plane":
        return needed
    for rows in observations:
        if orthometric != (rows.kind == "height_difference") and rows.kind != "control":
            needed[rows.marks.ravel()] = True
    return needed


def check_geoid(rows: TableRows, marks: Marks, needed: BoolArray, *, grid: bool, mistakes: Mistakes) -> list[str]:
    """Note marks that lack a geoid height others have; return what has to be said of the geoid in the listing."""
    given = ~np.isnan(rows.numbers["geoid"])
    if grid:
        return ["geoid heights come from the grid; the column 'geoid' of marks.csv is not used"] if given.any() else []
    if not needed.any():
        return []
    if not given[needed].any():
        return [
            "no geoid heights are given: the geoid is taken as the ellipsoid (0 m) at every mark, and heights above it "
            "are off by what it undulates"
        ]
    lacking = np.flatnonzero(needed & ~given)
    if len(lacking):
        names = listed((repr(marks.names[row]) for row in lacking), most=ENOUGH)
        verb = "has" if len(lacking) == 1 else "have"
        message = f"{names} {verb} no geoid height, but other marks do; give it to all, or a geoid_grid in the job file"
        rows.complain(mistakes, int(lacking[0]), "geoid", message)
    return []
