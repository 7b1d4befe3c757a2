"""Selected covariance: the entries of C = (AᵀA)⁻¹ within the fronts, from the root down, never the whole inverse.

Takahashi, Fagan & Chin 1973, *8th Power Industry Computer Applications Conference*, 63–69; Erisman & Tinney 1975,
*Communications of the ACM* 18, 177–179.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.solver.layout import Layout
from adjust.solver.row_variances import LOSS, careful_row_variances, quick_row_variances
from adjust.solver.sorting import rising
from adjust.solver.workers import one_blas_thread

if TYPE_CHECKING:
    from adjust.solver.factor import Factor


@dataclass(frozen=True)
class SelectedCovariance:
    """`entries` (m,) of C that were asked for, and `row_variances` (rows,) = diag(A C Aᵀ)."""

    entries: FloatArray
    row_variances: FloatArray


def selected_covariance(factor: Factor, first: IntArray, second: IntArray) -> SelectedCovariance:
    """Work down the tree and take from each front what was asked of it. Raises ValueError for a pair no front holds."""
    layout = factor.layout
    wanted = find_pairs(layout, first, second)
    entries = np.empty(len(first))
    variances, rounding = np.zeros((2, factor.matrix.shape[0]))
    held: dict[int, FloatArray] = {}

    def work(number: int) -> None:
        covariance = front_covariance(factor, number, held)
        if layout.from_children[number]:
            held[number] = covariance
        pairs = wanted.of_batch(number)
        entries[wanted.order[pairs]] = covariance.ravel().take(wanted.place[pairs])
        batch = layout.batches[number]
        if batch.runs:
            rows = layout.rows[batch.rows_here]
            found = quick_row_variances(batch, factor.elements[batch.elements_here], covariance)
            variances[rows], rounding[rows] = found

    with one_blas_thread(layout.tree.columns) as workers:
        for level, served in zip(reversed(layout.shapes.levels), reversed(layout.served), strict=True):
            workers.each(work, level)
            for number in served:
                del held[number]
        doubtful = np.flatnonzero(rounding > LOSS)
        variances[doubtful] = careful_row_variances(factor, doubtful)
    return SelectedCovariance(entries * factor.scale[first] * factor.scale[second], variances)


@dataclass(frozen=True)
class Pairs:
    """Pairs of columns sorted by batch (`order`), the `place` of each in the flat covariances, `cuts` by batch."""

    order: IntArray
    place: IntArray
    cuts: IntArray

    def of_batch(self, number: int) -> slice:
        """The pairs that are found in one batch."""
        return slice(int(self.cuts[number]), int(self.cuts[number + 1]))


def find_pairs(layout: Layout, first: IntArray, second: IntArray) -> Pairs:
    """The front that holds each pair of columns: that of the column eliminated first."""
    tree, shapes = layout.tree, layout.shapes
    first, second = tree.place[first], tree.place[second]
    front = tree.owner[np.minimum(first, second)]
    order = rising(shapes.home[front])
    front = front[order]
    row, column = (tree.position(front, end[order], shapes.own) for end in (first, second))
    size = (shapes.own + shapes.border)[front]
    cuts = np.searchsorted(shapes.home[front], np.arange(len(layout.batches) + 1))
    return Pairs(order, (shapes.slot[front] * size + row) * size + column, cuts)


def front_covariance(factor: Factor, number: int, held: dict[int, FloatArray]) -> FloatArray:
    """C (fronts, own + border, own + border) of the columns of each front of a batch.

    With W = −R_oo⁻¹ R_ob and the border's C_bb from the parents: C_ob = W C_bb, C_oo = R_oo⁻¹ R_oo⁻ᵀ + C_ob Wᵀ.
    """
    count, own, border = factor.layout.batches[number].shape
    inverse = factor.inverse(number)
    covariance = np.empty((count, own + border, own + border))
    inside, cross, outer = covariance[:, :own, :own], covariance[:, :own, own:], covariance[:, own:, own:]
    np.matmul(inverse, inverse.transpose(0, 2, 1), out=inside)
    if border:
        for hand in factor.layout.to_parents[number]:
            places = hand.corners[:, :, None] + hand.columns[:, None, :]
            outer[hand.members] = held[hand.target].ravel().take(places, mode="clip")
        reach = -(inverse @ factor.blocks[number][:, :, own:-1])
        np.matmul(reach, outer, out=cross)
        inside += cross @ reach.transpose(0, 2, 1)
        covariance[:, own:, :own] = cross.transpose(0, 2, 1)
    return covariance
