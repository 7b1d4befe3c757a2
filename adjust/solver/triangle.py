"""Stacks of upper triangles, column by column as LAPACK wants them: how they absorb rows, inverses, solutions."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.solver.lapack import for_each_block

PANEL = 16  # columns reflected at a time: measured, see docs/performance.md


def absorb(stack: FloatArray, piles: IntArray, wedges: IntArray) -> None:
    """Reduce each upper triangle and the rows below it to one upper triangle by Householder reflections, in place.

    `stack` (blocks, columns, rows) holds the blocks column by column, each with a triangle in its first rows. Of the
    rows below that, block b has the first `piles[b]`, and the last `wedges[b]` of these begin at least one column after
    each other, as those of an upper triangle do: their zeros are not worked on. What stands below the triangles
    afterwards has no meaning.
    """
    blocks, columns, rows = stack.shape
    panel = min(PANEL, columns)
    factors, work = np.empty((2, panel * columns))
    below = stack[:, :, columns:]
    for_each_block("dtpqrt", blocks, piles, columns, wedges, panel, stack, rows, below, rows, factors, panel, work, 0)


def inverted(triangles: FloatArray) -> FloatArray:
    """Inverse of each upper triangle (blocks, size, size), column by column as they are."""
    blocks, size, _ = triangles.shape
    inverses = triangles.copy()
    for_each_block("dtrtri", blocks, "U", "N", size, inverses, size, 0)
    return inverses


def solved(triangles: FloatArray, right: FloatArray) -> FloatArray:
    """x (blocks, size) with R x = right (blocks, size) for each upper triangle R (blocks, size, size) by columns."""
    blocks, size, _ = triangles.shape
    x = right.copy()
    for_each_block("dtrtrs", blocks, "U", "N", "N", size, 1, triangles, size, x, size, 0)
    return x


def own_triangles(block: FloatArray) -> FloatArray:
    """The own triangles (fronts, own, own), column by column, of a block (fronts, own, own + border + 1) of R."""
    return block.transpose(0, 2, 1)[:, : block.shape[1]]
