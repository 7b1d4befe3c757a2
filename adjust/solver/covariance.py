"""Selected covariance: the entries of C = (AᵀA)⁻¹ within the fronts, from the root down, never the whole inverse.

Takahashi, Fagan & Chin 1973 (8th PICA Conference, 63–69); Erisman & Tinney 1975, *Communications of the ACM* 18, 177–179.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray, IntArray

if TYPE_CHECKING:
    from adjust.solver.factor import Factor


@dataclass(frozen=True)
class SelectedCovariance:
    """`entries` (m,) of C that were asked for, and `row_variances` (rows,) = diag(A C Aᵀ)."""

    entries: FloatArray
    row_variances: FloatArray


def selected_covariance(factor: Factor, first: IntArray, second: IntArray) -> SelectedCovariance:
    """Work down the tree; from each front take what was asked of it. Raises ValueError for a pair no front holds."""
    tree = factor.tree
    a, b = tree.place[first], tree.place[second]
    front = np.minimum(tree.owner[a], tree.owner[b])
    entries = np.empty(len(front))
    variances = np.empty(factor.matrix.shape[0])
    data = factor.matrix.data * factor.scale[factor.matrix.indices]
    held: dict[int, FloatArray] = {}
    position_a, position_b = padded_positions(factor, front, a), padded_positions(factor, front, b)
    for number in reversed(range(len(factor.batches))):
        batch, block = factor.batches[number], factor.blocks[number]
        count, own, border = batch.shape
        outer = np.zeros((count, border, border))
        if border:
            outer = gather_outer(factor, number, held)
        inverse = np.linalg.inv(block[:, :, :own])
        reach = inverse @ block[:, :, own:-1]
        cross = -reach @ outer
        inside = inverse @ inverse.transpose(0, 2, 1) - cross @ reach.transpose(0, 2, 1)
        covariance = np.block([[inside, cross], [cross.transpose(0, 2, 1), outer]])
        held[number] = covariance
        where = np.full(tree.count, -1)
        where[batch.fronts] = np.arange(count)
        mine = np.flatnonzero(where[front] >= 0)
        entries[mine] = covariance[where[front[mine]], position_a[mine], position_b[mine]]
        rows = np.zeros((count * batch.rows, own + border + 1))
        rows.ravel()[batch.targets] = data[batch.entries]
        rows = rows.reshape(count, batch.rows, -1)[:, :, :-1]
        leverage = np.einsum("frc,frc->fr", rows @ covariance, rows)
        variances[batch.source_rows] = leverage.ravel()[batch.target_rows]
    return SelectedCovariance(entries * factor.scale[first] * factor.scale[second], variances)


def padded_positions(factor: Factor, front: IntArray, column: IntArray) -> IntArray:
    """Position of new columns in their padded fronts."""
    tree = factor.tree
    pads = np.empty(tree.count, dtype=np.int64)
    for batch in factor.batches:
        pads[batch.fronts] = batch.own.shape[1]
    own = np.diff(tree.start)
    position = tree.position(front, column)
    return np.where(position < own[front], position, position + (pads - own)[front])


def gather_outer(factor: Factor, number: int, held: dict[int, FloatArray]) -> FloatArray:
    """Covariance of the border columns (fronts, border, border), from the parents' fronts."""
    batch = factor.batches[number]
    count, _, border = batch.shape
    outer = np.zeros((count, border, border))
    for above, other in enumerate(factor.batches):
        for hand in other.handovers:
            if hand.source == number:
                covariance = held[above]
                at = np.where(hand.columns[:, :-1] < covariance.shape[1], hand.columns[:, :-1], 0)
                outer[hand.members] = covariance[hand.fronts[:, None, None], at[:, :, None], at[:, None, :]]
    return outer
