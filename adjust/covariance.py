"""Covariance of the unknowns where it is asked for: marks, observed lines, rows of correlated observations."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.datum import InnerDatum
from adjust.observations import Observations
from adjust.solver import Factor

Request = tuple[IntArray, IntArray]
"""Columns (k, p) against columns (k, q), −1 where there is no unknown: k blocks of p × q entries."""


@dataclass(frozen=True)
class Selected:
    """Covariance `blocks`, one array (k, p, q) for each request, 0 where a column is −1; and diag(ACAᵀ) by row."""

    blocks: tuple[FloatArray, ...]
    row_variances: FloatArray


def selected_blocks(factor: Factor, requests: Sequence[Request]) -> Selected:
    """All requested blocks in one pass down the solver's tree. σ₀ = 1."""
    firsts, seconds, masks = [], [], []
    for rows, columns in requests:
        shape = (*rows.shape, columns.shape[1])
        first = np.broadcast_to(rows[:, :, None], shape)
        second = np.broadcast_to(columns[:, None, :], shape)
        masks.append((first >= 0) & (second >= 0))
        firsts.append(first[masks[-1]])
        seconds.append(second[masks[-1]])
    covariance = factor.selected_covariance(np.concatenate(firsts), np.concatenate(seconds))
    blocks, used = [], 0
    for mask in masks:
        block = np.zeros(mask.shape)
        count = int(np.count_nonzero(mask))
        block[mask] = covariance.entries[used : used + count]
        blocks.append(block)
        used += count
    return Selected(tuple(blocks), covariance.row_variances)


class Transformation:
    """C̄ = S C Sᵀ of `adjust.datum` for blocks of C: C − G W − WᵀGᵀ + G V Gᵀ, W = M GₛᵀC, V = M GₛᵀC Gₛ Mᵀ,
    M = (GₛᵀG)⁻¹."""

    def __init__(self, factor: Factor, inner: InnerDatum) -> None:
        self.motions = inner.motions
        of_carried = factor.normal_solve(inner.carried)
        self.shares = of_carried @ inner.inverse.T
        self.spread = inner.inverse @ (inner.carried.T @ of_carried) @ inner.inverse.T

    def apply(self, block: FloatArray, request: Request) -> FloatArray:
        """One request's block after the transformation (k, p, q)."""
        rows, columns = request
        motion_rows, motion_columns = self._motions(rows), self._motions(columns)
        share_rows, share_columns = self._shares(rows), self._shares(columns)
        transformed: FloatArray = (
            block
            - np.einsum("kpm,kqm->kpq", motion_rows, share_columns)
            - np.einsum("kpm,kqm->kpq", share_rows, motion_columns)
            + np.einsum("kpm,mn,kqn->kpq", motion_rows, self.spread, motion_columns)
        )
        return transformed

    def _motions(self, columns: IntArray) -> FloatArray:
        return np.where((columns >= 0)[..., None], self.motions[columns], 0.0)

    def _shares(self, columns: IntArray) -> FloatArray:
        return np.where((columns >= 0)[..., None], self.shares[columns], 0.0)


def observed_lines(kinds: Sequence[Observations], marks: int) -> IntArray:
    """Every pair of marks that some observation joins (lines, 2), each once, lower index first, in order.

    An angle joins its station to both targets, not the targets to each other.
    """
    joined = [np.sort(rows.marks[:, [0, role]], axis=1) for rows in kinds for role in range(1, rows.marks.shape[1])]
    if not joined:
        return np.zeros((0, 2), dtype=np.int64)
    keys = np.unique(np.concatenate(joined) @ np.array([marks, 1]))
    return np.column_stack(np.divmod(keys, marks))
