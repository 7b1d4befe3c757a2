"""The numeric step: block orthogonal decomposition from the leaves of the tree to its root, and what follows from it.

Golub & Plemmons 1980, *Linear Algebra and its Applications* 34, 3–28; multifrontal QR: Davis 2011, *ACM Transactions on
Mathematical Software* 38(1), 8.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import prod
from threading import local

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.condition import condition_number
from adjust.solver.covariance import SelectedCovariance, selected_covariance
from adjust.solver.layout import Layout
from adjust.solver.opinion import SecondOpinion, second_opinion
from adjust.solver.rank import rank_defect, rank_tolerance, vanishing
from adjust.solver.substitution import multiply_inverse, multiply_inverse_transposed, solve_down
from adjust.solver.triangle import absorb, inverted, own_triangles
from adjust.solver.workers import one_blas_thread


@dataclass(frozen=True)
class Factor:
    """R of A = Q R, a stack of blocks for each batch of fronts, and what it tells about min |A x − b|.

    Each block (fronts, own, own + border + 1) holds the fronts' rows of R and of Qᵀb. Inside, columns stand in order of
    elimination and are scaled by `scale` to norms between 1 and 2; `elements` is the scaled matrix as laid out.
    """

    layout: Layout
    matrix: scipy.sparse.csr_array
    right_side: FloatArray
    scale: FloatArray
    elements: FloatArray
    blocks: tuple[FloatArray, ...]

    @cached_property
    def solution(self) -> FloatArray:
        """x (columns,) that makes |A x − b| least."""
        with one_blas_thread():
            return self.in_callers_columns(solve_down(self.layout, self.blocks))

    def normal_solve(self, block: FloatArray) -> FloatArray:
        """(AᵀA)⁻¹ times a block (columns, k)."""
        return self.apply_inverse(self.apply_inverse_transposed(block))

    def reweighted(self, weights: FloatArray) -> Factor:
        """The factor of the same system with its rows multiplied by `weights` (rows,). Raises RankDefect."""
        return factorise(self.layout, rows_weighted(self.matrix, weights), self.right_side * weights)

    def selected_covariance(self, first: IntArray, second: IntArray) -> SelectedCovariance:
        """Entries C[first, second] of C = (AᵀA)⁻¹, and diag(A C Aᵀ).

        `first` and `second` (m,) are columns, pair by pair; each pair must share a row of A or a group, which the
        diagonal always does. Raises ValueError for a pair that shares neither.
        """
        return selected_covariance(self, np.asarray(first), np.asarray(second))

    def condition_number(self) -> float:
        """Ratio of the largest to the smallest singular value of A with its columns scaled to unit norm."""
        return condition_number(self)

    def second_opinion(self) -> SecondOpinion:
        """The solution by another algorithm, LSQR, and its gap to this one's."""
        return second_opinion(self)

    @cached_property
    def inverses(self) -> dict[int, FloatArray]:
        """Those inverses of the batches' own triangles that were asked for so far."""
        return {}

    def inverse(self, number: int) -> FloatArray:
        """Inverse (fronts, own, own) of the own triangles of a batch."""
        if number not in self.inverses:
            self.inverses[number] = inverted(own_triangles(self.blocks[number])).transpose(0, 2, 1)
        return self.inverses[number]

    def apply_inverse(self, right: FloatArray) -> FloatArray:
        """R⁻¹ times a block (columns, k) in the order of elimination; the result in the caller's columns."""
        with one_blas_thread():
            return self.in_callers_columns(multiply_inverse(self, right))

    def apply_inverse_transposed(self, right: FloatArray) -> FloatArray:
        """R⁻ᵀ times a block (columns, k) of the caller's columns; the result in the order of elimination."""
        scaled = (np.asarray(right, dtype=float) * self.scale[:, None])[self.layout.tree.order]
        with one_blas_thread():
            return multiply_inverse_transposed(self, scaled)

    def in_callers_columns(self, inside: FloatArray) -> FloatArray:
        """Values (columns, …) put back from the order of elimination and from the scaling."""
        return (inside[self.layout.tree.place].T * self.scale).T


def rows_weighted(matrix: scipy.sparse.csr_array, weights: FloatArray) -> scipy.sparse.csr_array:
    """A matrix of the same pattern, its rows multiplied by `weights` (rows,)."""
    weighted = matrix.copy()
    weighted.data = matrix.data * np.repeat(weights, np.diff(matrix.indptr))
    return weighted


def factorise(layout: Layout, matrix: scipy.sparse.csr_array, right_side: FloatArray) -> Factor:
    """Decompose front by front; each keeps its own rows of R and hands the rest up. Raises RankDefect."""
    scale = powers_of_two(matrix)
    elements = (matrix.data * scale.take(matrix.indices)).take(layout.elements)
    right_side = np.asarray(right_side, dtype=float)
    right = right_side.take(layout.rows)
    tolerance = rank_tolerance(*matrix.shape)
    blocks: list[FloatArray] = []
    left: dict[int, FloatArray] = {}
    thread = local()

    def work(number: int) -> tuple[FloatArray, FloatArray]:
        batch = layout.batches[number]
        if not hasattr(thread, "memory"):
            thread.memory = np.empty(max(prod(batch.stack) for batch in layout.batches))
        stack = fill(thread.memory, layout, number, elements, right, left)
        absorb(stack, batch.piles, batch.wedges)
        _, own, border = batch.shape
        return stack[:, :, :own].copy().transpose(0, 2, 1), stack[:, own:, own : own + border].copy()

    with one_blas_thread(layout.tree.columns) as workers:
        for level, consumed in zip(layout.shapes.levels, layout.consumed, strict=True):
            for number, (block, rest) in zip(level, workers.each(work, level), strict=True):
                blocks.append(block)
                left[number] = rest
                place = vanishing(block, tolerance)
                if place is not None:
                    raise rank_defect(layout, blocks, number, place, scale)
            for number in consumed:
                del left[number]
    return Factor(layout, matrix, right_side, scale, elements, tuple(blocks))


def fill(
    memory: FloatArray,
    layout: Layout,
    number: int,
    elements: FloatArray,
    right: FloatArray,
    left: dict[int, FloatArray],
) -> FloatArray:
    """The stack of a batch, in `memory`: its rows of the matrix, what children left over, ones in padded columns."""
    batch = layout.batches[number]
    flat = memory[: prod(batch.stack)]
    flat[:] = 0.0
    flat[batch.targets] = elements[batch.elements_here]
    flat[batch.right_targets] = right[batch.rows_here]
    flat[batch.units] = 1.0
    for hand in layout.from_children[number]:
        places = hand.starts[:, :, None] + hand.rows[:, None, :]
        flat[places.ravel()] = hand.given(left[hand.source]).ravel()
    return flat.reshape(batch.stack)


def powers_of_two(matrix: scipy.sparse.csr_array) -> FloatArray:
    """Scale (columns,) that brings column norms between 1 and 2 and rounds nothing; 1 for empty columns."""
    norms = np.sqrt(np.bincount(matrix.indices, matrix.data**2, matrix.shape[1]))
    return np.where(norms > 0, np.exp2(1.0 - np.frexp(norms)[1]), 1.0)
