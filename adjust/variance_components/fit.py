"""The adjusted system under other weights: residuals, redundancies and tests of every observation, quickly.

Only the weights change: the linearisation, the pattern and the order of elimination are those of the adjustment.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.covariance import Request, selected_blocks
from adjust.model import Block, State, build_model, whitened
from adjust.quality import LEAST_REDUNDANCY
from adjust.solver import Factor

SET_ASIDE = 1e-6
"""Weight √p of a row that takes no part: it says nothing, and a mark that hangs on nothing else still stays."""


@dataclass(frozen=True)
class Fit:
    """All observations under some weights; arrays (observations,), kind after kind.

    `energy` is |ε|² of the whitened residuals, `redundancy` the trace of their cofactor matrix M, `test` εᵀM⁻¹ε, that
    of the m = `checked` components that anything checks. Of rows set aside energy and redundancy are 0 and `test` is
    that of their distance from what the others say.
    """

    factor: Factor
    energy: FloatArray
    redundancy: FloatArray
    test: FloatArray
    checked: IntArray


class Weighted:
    """The system of an adjustment, to be fitted under any scale (observations,) of the sds."""

    def __init__(self, adjustment: Adjustment) -> None:
        self.adjustment = adjustment
        self.blocks: tuple[Block, ...] = build_model(adjustment.job, adjustment.unknowns).blocks
        sizes = [len(block.observations) for block in self.blocks]
        self.components: IntArray = np.repeat([block.components for block in self.blocks], sizes)
        self.of_system_row: IntArray = np.repeat(np.arange(len(self.components)), self.components)
        """Observation of each system row; rows of the datum follow these."""
        self.places = [slice(end - size, end) for size, end in zip(sizes, np.cumsum(sizes).tolist(), strict=True)]

    @cached_property
    def _entries(self) -> list[FloatArray | None]:
        """Whitened derivatives (rows, components, width) of the kinds that are correlated."""
        geometry = self.adjustment.geometry
        state = State(geometry, self.adjustment.orientations)
        return [
            whitened(block.whitening(geometry), block.linearise(state)[1]) if block.components > 1 else None
            for block in self.blocks
        ]

    def as_adjusted(self) -> Fit:
        """The fit under the weights of the adjustment, as far as possible from what that found out."""
        if any(block.components > 1 for block in self.blocks):
            return self._fitted(self.adjustment._factor, _Weights.unchanged(len(self.components)))
        leverage = 1.0 - np.concatenate([table.redundancy[:, 0] for table in self.adjustment.residuals])
        return self._fit(self.adjustment._factor, _Weights.unchanged(len(leverage)), leverage, ())

    def under(self, scale: FloatArray, aside: BoolArray) -> Fit:
        """The fit with the sds multiplied by `scale`, rows `aside` taking no part."""
        weights = _Weights(np.where(aside, SET_ASIDE, 1.0), scale, aside)
        rows = np.ones(self.adjustment._factor.matrix.shape[0])
        rows[: len(self.of_system_row)] = weights.row[self.of_system_row]
        return self._fitted(self.adjustment._factor.reweighted(rows), weights)

    def _fitted(self, factor: Factor, weights: _Weights) -> Fit:
        correlated = [block for block in self.blocks if block.components > 1]
        requests: list[Request] = [(block.columns, block.columns) for block in correlated]
        if not requests:
            nothing = np.zeros(0, dtype=np.int64)
            return self._fit(factor, weights, factor.selected_covariance(nothing, nothing).row_variances, ())
        selected = selected_blocks(factor, requests)
        return self._fit(factor, weights, selected.row_variances, selected.blocks)

    def _fit(self, factor: Factor, weights: _Weights, leverage: FloatArray, covariances: tuple[FloatArray, ...]) -> Fit:
        """`leverage` (system rows,) is diag(ÃCÃᵀ); `covariances` are those of the unknowns of correlated rows."""
        residual = factor.matrix @ factor.solution - factor.right_side
        energy, redundancy, test = np.zeros((3, len(self.components)))
        checked = np.zeros(len(self.components), dtype=np.int64)
        left = iter(covariances)
        for block, here, entries in zip(self.blocks, self.places, self._entries, strict=True):
            own = residual[block.system_rows].reshape(-1, block.components) / weights.part[here, None]
            if entries is None:
                around = leverage[block.system_rows][:, None, None]
            else:
                scaled = entries * weights.row[here, None, None]
                around = scaled @ next(left) @ scaled.transpose(0, 2, 1)
            cofactor = _cofactor(around, weights.part[here], weights.aside[here])
            test[here], checked[here] = tested(own, cofactor)
            takes_part = ~weights.aside[here]
            energy[here] = np.where(takes_part, np.sum(own**2, axis=1), 0.0)
            redundancy[here] = np.where(takes_part, np.einsum("rii->r", cofactor), 0.0)
        return Fit(factor, energy, np.maximum(redundancy, 0.0), test, checked)


@dataclass(frozen=True)
class _Weights:
    """Arrays (observations,): `part` is 1, or `SET_ASIDE` where `aside`; sds are multiplied by `scale`."""

    part: FloatArray
    scale: FloatArray
    aside: BoolArray

    @classmethod
    def unchanged(cls, count: int) -> _Weights:
        """Those of the adjustment."""
        return cls(np.ones(count), np.ones(count), np.zeros(count, dtype=bool))

    @cached_property
    def row(self) -> FloatArray:
        """What the rows of the adjusted system are multiplied with."""
        return self.part / self.scale


def _cofactor(leverage: FloatArray, part: FloatArray, aside: BoolArray) -> FloatArray:
    """M = I − ÃCÃᵀ of rows that take part; I + ãCãᵀ, ã of full weight, of those set aside (rows, m, m)."""
    around = leverage / part[:, None, None] ** 2
    signed: FloatArray = np.eye(leverage.shape[1]) + np.where(aside[:, None, None], around, -around)
    return signed


def tested(residual: FloatArray, cofactor: FloatArray) -> tuple[FloatArray, IntArray]:
    """εᵀM⁻¹ε (rows,) over the directions that anything checks, and how many those are.

    `residual` (rows, m), `cofactor` (rows, m, m).
    """
    if residual.shape[1] == 1:
        values, along = cofactor[:, :, 0], residual
    else:
        values, vectors = np.linalg.eigh(cofactor)
        along = np.einsum("rij,ri->rj", vectors, residual)
    seen = values > LEAST_REDUNDANCY
    test: FloatArray = np.sum(np.where(seen, along**2 / np.where(seen, values, 1.0), 0.0), axis=1)
    return test, np.count_nonzero(seen, axis=1)
