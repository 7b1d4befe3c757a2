"""The numeric step: block orthogonal decomposition from the leaves of the tree to its root, and solutions with it.

Golub & Plemmons 1980, *Linear Algebra and its Applications* 34, 3–28; Davis 2011, *ACM TOMS* 38(1), 8 (multifrontal QR).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.batches import Batch
from adjust.solver.condition import condition_number
from adjust.solver.covariance import SelectedCovariance, selected_covariance
from adjust.solver.errors import RankDefect
from adjust.solver.opinion import SecondOpinion, second_opinion
from adjust.solver.tree import Tree

RANK_TOLERANCE = (
    20.0  # × (rows + columns) ε × largest column norm: the default of SuiteSparseQR (Davis 2011, section 2.5)
)
MOVED = 1e-6  # of the largest scaled component of a null vector: below it stands only its rounding


@dataclass(frozen=True)
class Factor:
    """R of A = Q R, block by block, for columns scaled to norms of 1 to 2, with the transformed right-hand side."""

    tree: Tree
    batches: tuple[Batch, ...]
    groups: IntArray
    matrix: scipy.sparse.csr_array
    right_side: FloatArray
    scale: FloatArray
    blocks: tuple[FloatArray, ...]

    @cached_property
    def solution(self) -> FloatArray:
        """x (columns,) that makes |A x − b| least."""
        heads = [block[:, :, -1:] for block in self.blocks]
        return self.restore(self.backward(heads))[:, 0]

    def normal_solve(self, block: FloatArray) -> FloatArray:
        """(AᵀA)⁻¹ times a block (columns, k)."""
        scaled = np.asarray(block, dtype=float) * self.scale[:, None]
        return self.restore(self.backward(self.forward(scaled[self.tree.order])))

    def selected_covariance(self, first: IntArray, second: IntArray) -> SelectedCovariance:
        """Entries C[first, second] of C = (AᵀA)⁻¹ for pairs that share a row or a group, and diag(A C Aᵀ)."""
        return selected_covariance(self, first, second)

    def condition_number(self) -> float:
        """Ratio of the extreme singular values of A with its columns scaled to unit norm."""
        return condition_number(self)

    def second_opinion(self) -> SecondOpinion:
        """The same solution by another algorithm, to compare with."""
        return second_opinion(self)

    def apply_inverse(self, y: FloatArray) -> FloatArray:
        """R⁻¹ y for y (columns,) in new order; the result in the caller's columns."""
        tail = np.append(y.ravel(), 0.0)
        return self.restore(self.backward([tail[batch.own][:, :, None] for batch in self.batches]))[:, 0]

    def apply_inverse_transposed(self, right: FloatArray) -> FloatArray:
        """R⁻ᵀ times a vector (columns,) of the caller's columns; the result in new order."""
        result = np.empty(self.tree.columns + 1)
        scaled = (right.ravel() * self.scale)[self.tree.order][:, None]
        for batch, head in zip(self.batches, self.forward(scaled), strict=True):
            result[batch.own] = head[:, :, 0]
        return result[:-1]

    def restore(self, scaled: FloatArray) -> FloatArray:
        """Solution (columns, k) in the caller's columns from one in new, scaled columns."""
        result = np.empty_like(scaled)
        result[self.tree.order] = scaled
        return result * self.scale[:, None]

    def backward(self, heads: list[FloatArray]) -> FloatArray:
        """Solve R x = y, y given front by front; x (columns, k) in new order."""
        count = self.tree.columns
        x = np.zeros((count + 1, heads[0].shape[2]))
        for batch, block, head in zip(reversed(self.batches), reversed(self.blocks), reversed(heads), strict=True):
            own = batch.own.shape[1]
            rest = head - block[:, :, own:-1] @ x[batch.border]
            x[batch.own] = np.linalg.solve(block[:, :, :own], rest)
            x[count] = 0.0
        return x[:count]

    def forward(self, right: FloatArray) -> list[FloatArray]:
        """Solve Rᵀ y = right (columns, k) in new order; y front by front."""
        rest = np.vstack([right, np.zeros((1, right.shape[1]))])
        heads = []
        for batch, block in zip(self.batches, self.blocks, strict=True):
            own = batch.own.shape[1]
            y = np.linalg.solve(block[:, :, :own].transpose(0, 2, 1), rest[batch.own])
            np.subtract.at(rest, batch.border, block[:, :, own:-1].transpose(0, 2, 1) @ y)
            rest[-1] = 0.0
            heads.append(y)
        return heads


def factorise(
    tree: Tree, batches: tuple[Batch, ...], groups: IntArray, matrix: scipy.sparse.csr_array, right_side: FloatArray
) -> Factor:
    """Decompose front by front; each keeps its own rows of R and hands the rest up."""
    scale = powers_of_two(matrix)
    data = matrix.data * scale[matrix.indices]
    tolerance = RANK_TOLERANCE * sum(matrix.shape) * np.finfo(float).eps
    left: dict[int, FloatArray] = {}
    blocks: list[FloatArray] = []
    for number, batch in enumerate(batches):
        stack = fill(batch, data, right_side, left)
        own = batch.own.shape[1]
        triangle = np.linalg.qr(stack, mode="r")
        left[number] = triangle[:, own : own + batch.border.shape[1], own:]
        blocks.append(np.ascontiguousarray(triangle[:, :own]))
        check_rank(tree, batches[: number + 1], blocks, scale, tolerance)
    return Factor(tree, batches, groups, matrix, right_side, scale, tuple(blocks))


def powers_of_two(matrix: scipy.sparse.csr_array) -> FloatArray:
    """Scale (columns,) that brings column norms between 1 and 2 without rounding; 1 for empty columns."""
    norms = column_norms(matrix)
    return np.where(norms > 0, np.exp2(1.0 - np.frexp(norms)[1]), 1.0)


def column_norms(matrix: scipy.sparse.csr_array) -> FloatArray:
    """Euclidean norm of each column."""
    return np.sqrt(np.bincount(matrix.indices, matrix.data**2, matrix.shape[1]))


def fill(batch: Batch, data: FloatArray, right_side: FloatArray, left: dict[int, FloatArray]) -> FloatArray:
    """The stacked fronts of a batch: rows of the matrix and rows left over by children, of which it takes hold."""
    count, own, border = batch.shape
    width = own + border + 1
    flat = np.zeros((count * batch.rows + 1, width + 1))
    place = flat[:-1, :-1]
    row, column = np.divmod(batch.targets, width)
    place[row, column] = data[batch.entries]
    place[batch.target_rows, -1] = right_side[batch.source_rows]
    row, column = np.divmod(batch.units, width)
    place[row, column] = 1.0
    for hand in batch.handovers:
        rows = left[hand.source][hand.members]
        flat[hand.rows[:, : rows.shape[1], None], hand.columns[:, None, :]] = rows
    return place.reshape(count, batch.rows, width)


def check_rank(
    tree: Tree, batches: tuple[Batch, ...], blocks: list[FloatArray], scale: FloatArray, tolerance: float
) -> None:
    """Raise RankDefect for the first vanishing diagonal element of the newest block."""
    batch, block = batches[-1], blocks[-1]
    own = batch.own.shape[1]
    small = np.abs(np.diagonal(block[:, :, :own], axis1=1, axis2=2)) <= tolerance
    if not small.any():
        return
    front, column = np.argwhere(small)[0]
    motion = null_vector(tree.columns, batches, blocks, int(front), int(column))
    moved = np.flatnonzero(np.abs(motion) > MOVED * np.abs(motion).max())
    original = np.empty_like(motion)
    original[tree.order] = motion
    original *= scale
    raise RankDefect(np.sort(tree.order[moved]), original / original[np.argmax(np.abs(original))])


def null_vector(
    columns: int, batches: tuple[Batch, ...], blocks: list[FloatArray], front: int, column: int
) -> FloatArray:
    """z (columns,) in new order with R z = 0: 1 in the dependent column, solved for in the columns before it."""
    motion = np.zeros(columns + 1)
    block = blocks[-1][front]
    motion[batches[-1].own[front, column]] = 1.0
    motion[batches[-1].own[front, :column]] = -np.linalg.solve(block[:column, :column], block[:column, column])
    for batch, block in zip(reversed(batches[:-1]), reversed(blocks[:-1]), strict=True):
        own = batch.own.shape[1]
        rest = -block[:, :, own:-1] @ motion[batch.border][:, :, None]
        moves = np.any(rest != 0, axis=(1, 2))
        motion[batch.own[moves]] = np.linalg.solve(block[moves, :, :own], rest[moves])[:, :, 0]
        motion[columns] = 0.0
    return motion[:columns]
