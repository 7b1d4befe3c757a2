"""Variances of the rows, a C aᵀ: quickly from the covariance of their front, or with care where that would cancel.

Where a precise row joins columns that are themselves poorly known, a C aᵀ is a small difference of large numbers, and
the square of the condition number is lost. The quick way is taken where that costs less than LOSS; elsewhere a C aᵀ is
the squared norm of R⁻ᵀaᵀ, which loses the condition number only once.
"""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.layout import Batch
from adjust.solver.sorting import distinct

if TYPE_CHECKING:
    from adjust.solver.factor import Factor

WIDE = 24  # elements: a row with more is multiplied by the whole front, one with fewer picks its elements of C
LOSS = 1e-9  # of a row variance, which is at most 1: rounding that no redundancy number or test can feel


def quick_row_variances(batch: Batch, elements: FloatArray, covariance: FloatArray) -> tuple[FloatArray, FloatArray]:
    """a C aᵀ (rows,) of the rows of a batch from the covariance of its fronts, and the rounding to expect in it.

    `elements` are those of the rows, `covariance` (fronts, columns, columns).
    """
    size, flat = covariance.shape[1], covariance.ravel()
    base = (batch.slots * size).take(batch.row_of_element) + batch.columns
    base *= size
    squares = elements**2 * flat.take(base + batch.columns)
    start = batch.row_starts
    variances = np.add.reduceat(squares, start)
    rounding = np.finfo(float).eps * np.add.reduceat(np.sqrt(np.maximum(squares, 0.0)), start) ** 2
    for run in batch.runs:
        each = elements[run.elements].reshape(-1, run.width)
        column, corner = (part[run.elements].reshape(-1, run.width) for part in (batch.columns, base))
        if run.width > WIDE:
            variances[run.rows] = wide_rows(batch.slots[run.rows], column, each, covariance)
            continue
        first, second = pairs_within(run.width)
        entries = flat.take(corner.take(first, axis=1) + column.take(second, axis=1))
        products = each.take(first, axis=1) * each.take(second, axis=1) * entries
        variances[run.rows] += 2.0 * products.sum(axis=1)
    return variances, rounding


@cache
def pairs_within(width: int) -> tuple[IntArray, IntArray]:
    """All pairs of different elements of a row."""
    first, second = np.triu_indices(width, 1)
    return first, second


def wide_rows(slots: IntArray, columns: IntArray, values: FloatArray, covariance: FloatArray) -> FloatArray:
    """a C aᵀ (rows,) of rows with many elements (rows, elements), front by front."""
    variances = np.empty(len(slots))
    for slot in distinct(slots):
        here = np.flatnonzero(slots == slot)
        dense = np.zeros((len(here), covariance.shape[1]))
        dense[np.arange(len(here))[:, None], columns[here]] = values[here]
        variances[here] = np.einsum("rc,rc->r", dense @ covariance[slot], dense)
    return variances


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
        solved = factor.inverse(home)[slot].T @ rest[batch.own[slot]]
        total += np.einsum("cr,cr->r", solved, solved)
        rest[batch.border[slot]] -= factor.blocks[home][slot, :, batch.own.shape[1] : -1].T @ solved
        rest[-1] = 0.0
        front = int(tree.parent[front])
    return total
