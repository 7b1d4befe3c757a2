"""Solutions with R, front by front: from the root down with R, from the leaves up with Rᵀ."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from adjust.arrays import FloatArray
from adjust.solver.layout import Layout
from adjust.solver.triangle import own_triangles, solved


def solve_down(layout: Layout, blocks: Sequence[FloatArray]) -> FloatArray:
    """x (columns,) in new order with R x = the transformed right-hand side, which is each block's last column."""
    x = np.zeros(layout.tree.columns + 1)
    for batch, block in zip(reversed(layout.batches), reversed(blocks), strict=True):
        own = batch.own.shape[1]
        rest = block[:, :, -1] - (block[:, :, own:-1] @ x[batch.border][:, :, None])[:, :, 0]
        x[batch.own] = solved(own_triangles(block), rest)
        x[-1] = 0.0
    return x[:-1]


def multiply_inverse(
    layout: Layout, blocks: Sequence[FloatArray], inverses: Sequence[FloatArray], right: FloatArray
) -> FloatArray:
    """R⁻¹ times a block (columns, k) in new order, with the inverses of the own triangles at hand."""
    x = np.vstack([right, np.zeros((1, right.shape[1]))])
    for batch, block, inverse in zip(reversed(layout.batches), reversed(blocks), reversed(inverses), strict=True):
        x[batch.own] = inverse @ (x[batch.own] - block[:, :, batch.own.shape[1] : -1] @ x[batch.border])
        x[-1] = 0.0
    return x[:-1]


def multiply_inverse_transposed(
    layout: Layout, blocks: Sequence[FloatArray], inverses: Sequence[FloatArray], right: FloatArray
) -> FloatArray:
    """R⁻ᵀ times a block (columns, k) in new order, with the inverses of the own triangles at hand."""
    width = right.shape[1]
    y = np.vstack([right, np.zeros((1, width))])
    across = np.arange(width)
    for batch, block, inverse in zip(layout.batches, blocks, inverses, strict=True):
        solved = inverse.transpose(0, 2, 1) @ y[batch.own]
        y[batch.own] = solved
        passed = block[:, :, batch.own.shape[1] : -1].transpose(0, 2, 1) @ solved
        np.subtract.at(y.ravel(), (batch.border[:, :, None] * width + across).ravel(), passed.ravel())
        y[-1] = 0.0
    return y[:-1]
