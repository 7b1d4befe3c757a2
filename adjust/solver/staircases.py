"""The rows of every front, sorted by their first non-zero column, so that its block is a staircase."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import IntArray
from adjust.solver.shapes import Shapes
from adjust.solver.sorting import counted, offsets_of, rising
from adjust.solver.tree import Tree


@dataclass(frozen=True)
class Staircases:
    """Place of every row in its front: rows of the matrix, rows handed up by children, rows of padding.

    `row_slot` is that of the matrix rows; `hand_slot` and `hand_column` (border elements,) say where row i and column i
    that a front hands up go in its parent, −1 for rows it does not hand up. `unit_*` list the padding: a padded own
    column holds a single one in a row of its own. `rows` is the number of rows of each front, `reach` (columns of the
    fronts, in working order end to end) how many of them begin at or before each column.
    """

    row_slot: IntArray
    hand_slot: IntArray
    hand_column: IntArray
    unit_front: IntArray
    unit_column: IntArray
    unit_slot: IntArray
    rows: IntArray
    reach: IntArray


def build_staircases(tree: Tree, shapes: Shapes, used: IntArray, lead: IntArray) -> Staircases:
    """Sort the rows of every front; `lead` (used rows,) is the first column of each of the matrix rows `used`."""
    rows, handed = handed_rows(tree, used, shapes.own)
    above = tree.parent[tree.front_of_border]
    hand_column = tree.position(above, tree.border, shapes.own)
    exists = counted(tree.border_sizes) < handed[tree.front_of_border]
    padding = shapes.own - tree.own_sizes
    unit_front = np.repeat(np.arange(tree.count), padding)
    unit_column = tree.own_sizes[unit_front] + counted(padding)
    front = np.concatenate([tree.front_of_row[used], above[exists], unit_front])
    first = np.concatenate([lead, hand_column[exists], unit_column])
    slot, reach = sort_rows(shapes, front, first)
    row_slot, existing, unit_slot = np.split(slot, np.cumsum([len(used), np.count_nonzero(exists)]))
    hand_slot = np.full(len(tree.border), -1)
    hand_slot[exists] = existing
    return Staircases(row_slot, hand_slot, hand_column, unit_front, unit_column, unit_slot, rows, reach)


def sort_rows(shapes: Shapes, front: IntArray, first: IntArray) -> tuple[IntArray, IntArray]:
    """Slot of each row in its front by first column, and how many rows of a front begin at or before each column."""
    width = shapes.width[shapes.in_order]
    start = np.empty(len(width), dtype=np.int64)
    start[shapes.in_order] = np.cumsum(width) - width
    stair = start[front] + first
    total = offsets_of(np.bincount(stair, minlength=int(width.sum())))
    slot = np.empty(len(stair), dtype=np.int64)
    slot[rising(stair)] = counted(np.bincount(front, minlength=len(width))[shapes.in_order])
    return slot, total[1:] - np.repeat(total[start[shapes.in_order]], width)


def handed_rows(tree: Tree, used: IntArray, own: IntArray) -> tuple[IntArray, IntArray]:
    """Rows of each front when padded to `own` columns, and how many it hands up: at most one per border column."""
    rows = (np.bincount(tree.front_of_row[used], minlength=tree.count) + own - tree.own_sizes).tolist()
    need, most, parent = own.tolist(), tree.border_sizes.tolist(), tree.parent.tolist()
    handed = [0] * tree.count
    for front in range(tree.count):
        handed[front] = max(0, min(most[front], rows[front] - need[front]))
        if parent[front] >= 0:
            rows[parent[front]] += handed[front]
    return np.array(rows, dtype=np.int64), np.array(handed, dtype=np.int64)
