"""Solutions with R, front by front: from the root down with R, from the leaves up with Rᵀ."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray
from adjust.solver.layout import Layout
from adjust.solver.triangle import own_triangles, solved

if TYPE_CHECKING:
    from adjust.solver.factor import Factor


def solve_down(layout: Layout, blocks: Sequence[FloatArray]) -> FloatArray:
    """x (columns,) in new order with R x = the transformed right-hand side, which is each block's last column."""
    x = np.zeros(layout.tree.columns + 1)
    for batch, block in zip(reversed(layout.batches), reversed(blocks), strict=True):
        own = batch.own.shape[1]
        rest = block[:, :, -1] - (block[:, :, own:-1] @ x[batch.border][:, :, None])[:, :, 0]
        x[batch.own] = solved(own_triangles(block), rest)
        x[-1] = 0.0
    return x[:-1]


def multiply_inverse(factor: Factor, right: FloatArray) -> FloatArray:
    """R⁻¹ times a block (columns, k) in new order, with the inverses of the own triangles."""
    x = np.vstack([right, np.zeros((1, right.shape[1]))])
    for number in reversed(range(len(factor.blocks))):
        batch, block = factor.layout.batches[number], factor.blocks[number]
        rest = x[batch.own] - block[:, :, batch.own.shape[1] : -1] @ x[batch.border]
        x[batch.own] = factor.inverse(number) @ rest
        x[-1] = 0.0
    return x[:-1]


def multiply_inverse_transposed(factor: Factor, right: FloatArray) -> FloatArray:
    """R⁻ᵀ times a block (columns, k) in new order, with the inverses of the own triangles."""
    width = right.shape[1]
    y = np.vstack([right, np.zeros((1, width))])
    across = np.arange(width)
    for number, (batch, block) in enumerate(zip(factor.layout.batches, factor.blocks, strict=True)):
        here = factor.inverse(number).transpose(0, 2, 1) @ y[batch.own]
        y[batch.own] = here
        passed = block[:, :, batch.own.shape[1] : -1].transpose(0, 2, 1) @ here
        np.subtract.at(y.ravel(), (batch.border[:, :, None] * width + across).ravel(), passed.ravel())
        y[-1] = 0.0
    return y[:-1]
