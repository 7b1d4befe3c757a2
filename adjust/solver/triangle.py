"""Upper triangles of stacked staircase blocks by Householder reflections."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray, IntArray

SMALL = 32_000  # elements: LAPACK's unblocked steps work from the processor's cache, and skip the zeros of a staircase
PANEL = 32  # columns reflected at a time in larger blocks: measured, see docs/performance.md
BELOW = np.tri(PANEL, k=-1)  # what a panel keeps of its reflection vectors beneath their leading ones
DIAGONAL = np.arange(PANEL)


def triangularise(stack: FloatArray, reach: IntArray) -> FloatArray:
    """R (blocks, columns, columns) of each block (blocks, rows, columns) of a stack, which is overwritten.

    Rows are sorted by first non-zero column; `reach` (columns,) is how many begin at or before each column.
    """
    _, rows, columns = stack.shape
    if rows * columns <= SMALL:
        return np.asarray(np.linalg.qr(stack, mode="r"))
    for start in range(0, min(rows, columns), PANEL):
        end = min(start + PANEL, columns)
        active = min(max(int(reach[end - 1]), end), rows)
        reflect_panel(stack[:, start:active, start:], end - start)
    return np.triu(stack[:, :columns])


def reflect_panel(block: FloatArray, width: int) -> None:
    """Triangularise the first `width` columns of each block and apply the reflections to the others, in place.

    The product of the reflections is I − V T Vᵀ with T⁻¹ the upper triangle of VᵀV, 1/τ on its diagonal (Joffrain, Low,
    Quintana-Ortí, van de Geijn & Van Zee 2006, *ACM Transactions on Mathematical Software* 32, 169–179).
    """
    packed, tau = np.linalg.qr(block[:, :, :width], mode="raw")
    steps = tau.shape[1]
    vectors, diagonal = packed.transpose(0, 2, 1)[:, :, :steps], DIAGONAL[:steps]
    block[:, :steps, :width] = packed.transpose(0, 2, 1)[:, :steps]
    if block.shape[2] == width:
        return
    vectors[:, :steps] *= BELOW[:steps, :steps]
    vectors[:, diagonal, diagonal] = 1.0
    if not tau.all():  # a column of zeros needs no reflection
        vectors *= (tau != 0)[:, None, :]
        tau = np.where(tau == 0, 1.0, tau)
    inverse = vectors.transpose(0, 2, 1) @ vectors
    inverse *= BELOW[:steps, :steps]
    inverse[:, diagonal, diagonal] = 1.0 / tau
    rest = block[:, :, width:]
    rest -= vectors @ (np.linalg.inv(inverse) @ (vectors.transpose(0, 2, 1) @ rest))
