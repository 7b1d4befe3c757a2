"""Variances of the rows, a C aᵀ: quickly from the covariance of their front, or with care where that would cancel.

Where a precise row joins columns that are themselves poorly known, a C aᵀ is a small difference of large numbers, and
the square of the condition number is lost. The quick way is taken where that costs less than LOSS; elsewhere a C aᵀ is
the squared norm of R⁻ᵀaᵀ, which loses the condition number only once.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.layout import Batch, Run

if TYPE_CHECKING:
    from adjust.solver.factor import Factor

WIDE = 24  # elements: a row with more is multiplied by the whole front, one with fewer picks its elements of C
LOSS = 1e-9  # of a row variance, which is at most 1: rounding that no redundancy number or test can feel


def quick_row_variances(
    batch: Batch, run: Run, elements: FloatArray, covariance: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """a C aᵀ (rows,) of one run of a batch from the covariance of its fronts, and the rounding to expect in it."""
    count, size, _ = covariance.shape
    first = batch.elements_here.start
    targets = batch.targets[run.elements.start - first : run.elements.stop - first].reshape(-1, run.width)
    row, column = np.divmod(targets, size + 1)
    values = elements[run.elements].reshape(-1, run.width)
    diagonal = np.diagonal(covariance, axis1=1, axis2=2)[row // batch.rows, column]
    terms = np.abs(values) * np.sqrt(np.maximum(diagonal, 0.0))
    rounding = np.finfo(float).eps * terms.sum(axis=1) ** 2
    if run.width > WIDE:
        dense = np.zeros((count * batch.rows, size))
        dense[row, column] = values
        dense = dense.reshape(count, batch.rows, size)
        return np.einsum("frc,frc->fr", dense @ covariance, dense).ravel()[row[:, 0]], rounding
    base = row[:, :1] // batch.rows * size
    picked = covariance.ravel()[((base + column) * size)[:, :, None] + column[:, None, :]]
    return np.einsum("ri,rij,rj->r", values, picked, values), rounding


def careful_row_variances(factor: Factor, rows: IntArray) -> FloatArray:
    """|R⁻ᵀaᵀ|² (rows,) of rows of the matrix, solved for front by front from each row's own front to the root."""
    variances = np.empty(len(rows))
    fronts = factor.layout.tree.front_of_row[rows]
    order = np.argsort(fronts, kind="stable")
    for together in np.split(order, np.flatnonzero(np.diff(fronts[order])) + 1):
        if len(together):
            block = factor.matrix[rows[together]].tocoo()
            variances[together] = squared_norms(factor, int(fronts[together[0]]), block)
    return variances


def squared_norms(factor: Factor, front: int, block: scipy.sparse.coo_array) -> FloatArray:
    """|R⁻ᵀaᵀ|² of rows that all begin in one front."""
    tree, shapes = factor.layout.tree, factor.layout.shapes
    rest = np.zeros((tree.columns + 1, block.shape[0]))
    row, column = block.coords
    rest[tree.place[column], row] = block.data * factor.scale[column]
    total = np.zeros(block.shape[0])
    while front >= 0:
        home, slot = int(shapes.home[front]), int(shapes.slot[front])
        batch = factor.layout.batches[home]
        solved = factor.inverses[home][slot].T @ rest[batch.own[slot]]
        total += np.einsum("cr,cr->r", solved, solved)
        rest[batch.border[slot]] -= factor.blocks[home][slot, :, batch.own.shape[1] : -1].T @ solved
        rest[-1] = 0.0
        front = int(tree.parent[front])
    return total
