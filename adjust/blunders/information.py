"""The information matrix G = HᵀMH = HᵀH − HᵀÃ C ÃᵀH of all supposed errors, whole or column by column."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Protocol

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import FloatArray, IntArray
from adjust.solver import Factor

AT_ONCE = 256
"""Columns solved for together: enough for speed, few enough to spare the memory of a large network."""


class InformationMatrix(Protocol):
    """G of all columns, or columns of it."""

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

    @classmethod
    def of(cls, supposed: csr_array, through: csr_array, factor: Factor) -> DenseInformation:
        """Of H, `supposed`, and ÃᵀH, `through`."""
        matrix = np.empty((supposed.shape[1], supposed.shape[1]))
        for first in range(0, len(matrix), AT_ONCE):
            part = np.arange(first, min(first + AT_ONCE, len(matrix)))
            matrix[:, part] = solved(supposed, through, factor, part)
        return cls((matrix + matrix.T) / 2)

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
    """G column by column, each by one solution with the factor; what was asked for once is kept.

    `supposed` is H, `through` ÃᵀH, `diagonal` (columns,) that of G, which the selected covariance gives.
    """

    supposed: csr_array
    through: csr_array
    factor: Factor
    diagonal: FloatArray
    _kept: dict[int, FloatArray] = field(default_factory=dict, repr=False)

    def columns(self, wanted: IntArray) -> FloatArray:
        """Columns (columns, k) of G."""
        lacking = np.array([column for column in dict.fromkeys(wanted.tolist()) if column not in self._kept], np.int64)
        for first in range(0, len(lacking), AT_ONCE):
            part = lacking[first : first + AT_ONCE]
            self._kept.update(zip(part.tolist(), solved(self.supposed, self.through, self.factor, part).T, strict=True))
        strips = np.empty((self.supposed.shape[1], len(wanted)), order="F")
        for place, column in enumerate(wanted.tolist()):
            strips[:, place] = self._kept[column]
        return strips

    def block(self, rows: IntArray, columns: IntArray) -> FloatArray:
        """G (k, l) of some rows (k,) and columns (l,)."""
        return self.columns(columns)[rows]

    def blocks(self, members: IntArray) -> FloatArray:
        """Diagonal blocks (m, q, q) of members (m, q)."""
        whole = self.columns(members.ravel())
        place = np.arange(members.size).reshape(members.shape)
        return whole[members[:, :, None], place[:, None, :]]


def solved(supposed: csr_array, through: csr_array, factor: Factor, columns: IntArray) -> FloatArray:
    """Columns (columns, k) of G, each by one solution with the factor."""
    spread = factor.normal_solve(through[:, columns].toarray())
    return np.asarray((supposed.T @ supposed[:, columns]).toarray() - through.T @ spread)
