"""The rows of every front: one for each step of a triangle, the others below it, sorted by first non-zero column."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import IntArray
from adjust.solver.shapes import Shapes
from adjust.solver.sorting import rising
from adjust.solver.tree import Tree


@dataclass(frozen=True)
class Staircases:
    """Which row of its front each row of the matrix, and each row handed up by a child, becomes.

    Row i of a child's border is handed up as a row that begins in the child's border column i, which is column
    `hand_column` (border elements,) of the parent. The first row of a front that begins in a column becomes that row of
    the front's triangle; the others are numbered on below it, sorted by the column they begin in: `matrix_row` (rows of
    the matrix) and `hand_row` (border elements,). `piles` (fronts,) counts the others; the last `wedges` (fronts,) of
    them begin at least one column after each other, as the rows of a triangle do.
    """

    hand_column: IntArray
    hand_row: IntArray
    matrix_row: IntArray
    piles: IntArray
    wedges: IntArray


def build_staircases(tree: Tree, shapes: Shapes, front: IntArray, lead: IntArray) -> Staircases:
    """Sort the rows of every front; `front` and `lead` (rows,) are those of the rows of the matrix."""
    above = tree.parent[tree.front_of_border]
    hand_column = tree.position(above, tree.border, shapes.own)
    front, lead = np.concatenate([above, front]), np.concatenate([hand_column, lead])
    start = np.cumsum(shapes.width) - shapes.width
    order = rising(start[front] + lead)
    sorted_front, sorted_lead = front[order], lead[order]
    below = np.diff(start[sorted_front] + sorted_lead, prepend=-1) == 0
    piles = np.bincount(sorted_front[below], minlength=tree.count)
    rank = np.cumsum(below) - 1 - (np.cumsum(piles) - piles)[sorted_front]
    steep = np.zeros(tree.count, dtype=np.int64)
    np.maximum.at(steep, sorted_front[below], (rank - sorted_lead)[below])
    row = np.empty_like(rank)
    row[order] = np.where(below, shapes.width[sorted_front] + rank, sorted_lead)
    hand_row, matrix_row = np.split(row, [len(hand_column)])
    return Staircases(hand_column, hand_row, matrix_row, piles, piles - steep)
