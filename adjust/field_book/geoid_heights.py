"""Whether the job knows the geoid where its observations need it."""

from __future__ import annotations

import numpy as np

from adjust.arrays import BoolArray, FloatArray
from adjust.field_book.columns import TableRows
from adjust.field_book.mistakes import ENOUGH, Mistakes, listed
from adjust.frames import Frame, GeoidGrid
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
        if orthometric != (rows.kind == "height_difference"):
            needed[rows.marks.ravel()] = True
    return needed


def check_geoid(
    rows: TableRows, marks: Marks, needed: BoolArray, grid: GeoidGrid | None, mistakes: Mistakes
) -> list[str]:
    """Note marks that lack a geoid height others have; return what has to be said of the geoid in the listing."""
    given = ~np.isnan(rows.numbers["geoid"])
    if grid is not None:
        _check_grid(rows, marks, needed, grid.heights(marks.given[:, :2]), mistakes)
        return ["geoid heights come from the grid; those of marks.csv are not used"] if given.any() else []
    if needed.any() and not given[needed].any():
        return ["no geoid heights are given: the geoid is taken to be the ellipsoid, its height 0 at every mark"]
    names = _named(marks, needed & ~given)
    if names:
        message = f"{names} without a geoid height, which other marks have; give it to all, or name a geoid_grid"
        rows.complain(mistakes, int(np.argmax(needed & ~given)), "geoid", message)
    return []


def _check_grid(rows: TableRows, marks: Marks, needed: BoolArray, heights: FloatArray, mistakes: Mistakes) -> None:
    outside = needed & np.isnan(heights) & ~np.isnan(marks.given[:, :2]).any(axis=1)
    if outside.any():
        message = f"{_named(marks, outside)} outside the geoid grid; name a grid that covers the job"
        rows.complain(mistakes, int(np.argmax(outside)), "mark", message)


def _named(marks: Marks, where: BoolArray) -> str:
    names = [repr(marks.names[row]) for row in np.flatnonzero(where)]
    return f"mark{'' if len(names) == 1 else 's'} {listed(names, most=ENOUGH)}" if names else ""
