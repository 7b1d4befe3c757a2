"""The symbolic step: everything about a sparse system that its pattern alone decides, done once and used again."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.dissection import dissect
from adjust.solver.factor import Factor, factorise
from adjust.solver.layout import Layout, lay_out
from adjust.solver.pattern import groups_of_rows, meeting_pairs, tied_to_everything
from adjust.solver.tree import grow_tree


@dataclass(frozen=True)
class Analysis:
    """The order of elimination and the places of all entries for one pattern of rows and columns."""

    indptr: IntArray
    indices: IntArray
    layout: Layout

    def factorise(self, matrix: scipy.sparse.csr_array, right_side: FloatArray) -> Factor:
        """Orthogonal decomposition of (A | b) for an A (rows, columns) of the analysed pattern.

        Raises RankDefect when columns are dependent and ValueError when the pattern is another.
        """
        if not (np.array_equal(matrix.indptr, self.indptr) and np.array_equal(matrix.indices, self.indices)):
            raise ValueError("the matrix has another pattern than the one analysed")
        return factorise(self.layout, matrix, right_side)


def analyse(matrix: scipy.sparse.csr_array, groups: IntArray, positions: FloatArray | None = None) -> Analysis:
    """Decide the order of elimination for all matrices (rows, columns) with the pattern of this one.

    `groups` (columns,) says which group of columns (all unknowns of a mark) each column belongs to; `positions`
    (groups, 2) where the groups lie, NaN where unknown. Groups without columns are allowed.
    """
    count = max(int(groups.max(initial=-1)) + 1, 0 if positions is None else len(positions))
    row, group = groups_of_rows(matrix, groups, count)
    pairs = meeting_pairs(row, group, count)
    tied = tied_to_everything(row, group, pairs, count)
    sizes = np.bincount(groups, minlength=count)
    node = dissect(pairs, sizes, positions, tied)
    tree = grow_tree(node, groups, row, group, matrix.shape[0])
    return Analysis(matrix.indptr, matrix.indices, lay_out(tree, matrix))
