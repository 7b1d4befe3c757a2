"""The information matrix G = HᵀMH of all supposed errors, whole or as far as it is asked for."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Protocol

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import FloatArray, IntArray
from adjust.solver import Factor


class InformationMatrix(Protocol):
    """G of all columns, whole or in parts."""

    @property
    def affordable(self) -> int:
        """Columns that may be asked for at once without a second thought."""
        ...

    @property
    def diagonal(self) -> FloatArray:
        """Diagonal (columns,)."""
        ...

    def columns(self, wanted: IntArray) -> FloatArray:
        """Columns (columns, k) of G."""
        ...

    def block(self, rows: IntArray, columns: IntArray) -> FloatArray:
        """G (k, l) of some rows (k,) and columns (l,)."""
        ...

    def blocks(self, members: IntArray) -> FloatArray:
        """Diagonal blocks (m, q, q) of members (m, q)."""
        ...


@dataclass(frozen=True)
class DenseInformation:
    """G in memory: for up to a few thousand columns."""

    matrix: FloatArray
    affordable = 400

    @cached_property
    def diagonal(self) -> FloatArray:
        """Diagonal (columns,)."""
        return np.diagonal(self.matrix).copy()

    def columns(self, wanted: IntArray) -> FloatArray:
        """Columns (columns, k) of G."""
        return self.matrix[:, wanted]

    def block(self, rows: IntArray, columns: IntArray) -> FloatArray:
        """G (k, l) of some rows (k,) and columns (l,)."""
        return self.matrix[np.ix_(rows, columns)]

    def blocks(self, members: IntArray) -> FloatArray:
        """Diagonal blocks (m, q, q) of members (m, q)."""
        return self.matrix[members[:, :, None], members[:, None, :]]


@dataclass(frozen=True)
class SparseInformation:
    """G = HᵀH − HᵀÃ C ÃᵀH column by column, each by one solution with the factor; what was asked for once is kept.

    `columns` is H, `through` ÃᵀH; `singles` are the diagonal blocks (rows, c, c) of the observations' own errors, with
    the first column of each kind. The columns behind them are those of groups.
    """

    supposed: csr_array
    through: csr_array
    factor: Factor
    singles: tuple[tuple[int, FloatArray], ...]
    affordable = 12
    _kept: dict[int, FloatArray] = field(default_factory=dict, repr=False)
    _blocks: dict[tuple[bytes, bytes], FloatArray] = field(default_factory=dict, repr=False)

    @cached_property
    def diagonal(self) -> FloatArray:
        """Diagonal (columns,) of G."""
        own = [np.einsum("rii->ri", block).ravel() for _, block in self.singles]
        first = sum(len(part) for part in own)
        groups = np.arange(first, self.supposed.shape[1])
        return np.concatenate([*own, self.columns(groups)[groups, np.arange(len(groups))]])

    def columns(self, wanted: IntArray) -> FloatArray:
        """Columns (columns, k) of G."""
        lacking = self._lacking(wanted)
        if len(lacking):
            self._kept.update(zip(lacking.tolist(), self._solved(lacking).T, strict=True))
        strips = np.empty((self.supposed.shape[1], len(wanted)))
        for place, column in enumerate(wanted.tolist()):
            strips[:, place] = self._kept[column]
        return strips

    def block(self, rows: IntArray, columns: IntArray) -> FloatArray:
        """G (k, l) of some rows (k,) and columns (l,); columns that are solved for here are not kept."""
        lacking = self._lacking(columns)
        fresh = dict(zip(lacking.tolist(), self._fresh(rows, lacking).T, strict=True)) if len(lacking) else {}
        known = [fresh[column] if column in fresh else self._kept[column][rows] for column in columns.tolist()]
        return np.array(known).reshape(len(columns), len(rows)).T

    def _fresh(self, rows: IntArray, lacking: IntArray) -> FloatArray:
        """Entries (k, l) of columns that are not kept. The same few are asked for again and again."""
        key = (rows.tobytes(), lacking.tobytes())
        if key not in self._blocks:
            self._blocks[key] = self._solved(lacking)[rows]
        return self._blocks[key]

    def _lacking(self, wanted: IntArray) -> IntArray:
        lacking = [column for column in dict.fromkeys(wanted.tolist()) if column not in self._kept]
        return np.array(lacking, dtype=np.int64)

    def _solved(self, columns: IntArray) -> FloatArray:
        spread = self.factor.normal_solve(self.through[:, columns].toarray())
        return np.asarray((self.supposed.T @ self.supposed[:, columns]).toarray() - self.through.T @ spread)

    def blocks(self, members: IntArray) -> FloatArray:
        """Diagonal blocks (m, q, q) of members (m, q): those of whole observations are known, groups are solved for."""
        width = members.shape[1]
        blocks = np.empty((len(members), width, width))
        waiting = np.ones(len(members), dtype=bool)
        for first, own in self.singles:
            row, component = np.divmod(members[:, 0] - first, own.shape[1])
            if own.shape[1] == width:
                here = (row >= 0) & (row < len(own)) & (component == 0)
                blocks[here] = own[row[here]]
                waiting &= ~here
        if waiting.any():
            chosen = members[waiting]
            whole = self.columns(chosen.ravel())
            place = np.arange(chosen.size).reshape(chosen.shape)
            blocks[waiting] = whole[chosen[:, :, None], place[:, None, :]]
        return blocks
