"""Dependent columns: found on the diagonal of R, explained by a motion that no row resists."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.errors import HubtackError
from adjust.solver.layout import Layout

RANK_TOLERANCE = (
    20.0  # × (rows + columns) ε × largest column norm: the default of SuiteSparseQR (Davis 2011, section 2.5)
)
MOVED = 1e-6  # of the largest component of the motion, columns scaled: below it stands only its rounding


class RankDefect(HubtackError):  # noqa: N818  (a state of the columns, named as the trade names it)
    """The columns are dependent to working accuracy: some motion of the unknowns changes no row.

    `motion` (columns,) is such a motion, its largest component 1; `columns` are those that it moves.
    """

    def __init__(self, columns: IntArray, motion: FloatArray) -> None:
        self.columns = columns
        self.motion = motion
        super().__init__(f"the rows do not determine {len(columns)} of the {len(motion)} columns")


def rank_tolerance(rows: int, columns: int) -> float:
    """Diagonal element of R, columns scaled to norms of at most 2, at or below which its column is dependent."""
    return RANK_TOLERANCE * (rows + columns) * float(np.finfo(float).eps)


def vanishing(block: FloatArray, tolerance: float) -> tuple[int, int] | None:
    """Front and own column of the first vanishing diagonal element of R (fronts, own, columns), if there is one."""
    diagonal = np.abs(np.diagonal(block, axis1=1, axis2=2))
    if diagonal.size == 0 or diagonal.min() > tolerance:
        return None
    front, column = np.argwhere(diagonal <= tolerance)[0]
    return int(front), int(column)


def rank_defect(
    layout: Layout, blocks: Sequence[FloatArray], number: int, place: tuple[int, int], scale: FloatArray
) -> RankDefect:
    """The defect found at `place` (front, own column) of batch `number`, as a motion of the caller's columns."""
    tree = layout.tree
    motion = np.empty(tree.columns)
    motion[tree.order] = null_vector(layout, blocks, number, place)
    moved = np.flatnonzero(np.abs(motion) > MOVED * np.abs(motion).max())
    motion *= scale
    return RankDefect(moved, motion / motion[np.argmax(np.abs(motion))])


def null_vector(layout: Layout, blocks: Sequence[FloatArray], number: int, place: tuple[int, int]) -> FloatArray:
    """z (columns,) in new order with R z = 0: 1 in the dependent column, and what follows in the columns before it."""
    front, column = place
    batch, block = layout.batches[number], blocks[number][front]
    motion = np.zeros(layout.tree.columns + 1)
    motion[batch.own[front, column]] = 1.0
    motion[batch.own[front, :column]] = -np.linalg.solve(block[:column, :column], block[:column, column])
    for below in reversed(range(number)):
        batch, block = layout.batches[below], blocks[below]
        own = batch.own.shape[1]
        rest = -block[:, :, own:-1] @ motion[batch.border][:, :, None]
        moves = np.any(rest != 0, axis=(1, 2))
        motion[batch.own[moves]] = np.linalg.solve(block[moves, :, :own], rest[moves])[:, :, 0]
        motion[-1] = 0.0
    return motion[:-1]
