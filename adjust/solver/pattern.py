"""Which groups of columns meet in a row: the graph that the dissection cuts."""

from __future__ import annotations

import numpy as np
import scipy.sparse

from adjust.arrays import BoolArray, IntArray
from adjust.solver.sorting import distinct

WIDE_ROW = 32  # groups: a row over more of them would make hundreds of pairs; its groups go to the root instead
DENSE_DEGREE = 10.0  # × √groups neighbours, and at least 16: the bound for dense rows of Amestoy, Davis & Duff (2004)


def groups_of_rows(matrix: scipy.sparse.csr_array, groups: IntArray, count: int) -> tuple[IntArray, IntArray]:
    """Each row's distinct groups, as parallel arrays (row, group) sorted by row and group."""
    row = np.repeat(np.arange(matrix.shape[0]), np.diff(matrix.indptr))
    code = row * count + groups.take(matrix.indices)
    code = distinct(
        code[np.diff(code, prepend=-1) != 0]
    )  # neighbours first: most columns of a group stand side by side
    row = code // count
    return row, code - row * count


def meeting_pairs(row: IntArray, group: IntArray, count: int) -> IntArray:
    """Distinct pairs (pairs, 2) of groups, lower first, that share a row; rows over WIDE_ROW groups are left out."""
    start = np.flatnonzero(np.diff(row, prepend=-1))
    width = np.diff(start, append=len(row))
    codes = [np.empty(0, dtype=np.int64)]
    for members in np.flatnonzero(np.bincount(width)[: WIDE_ROW + 1])[1 if len(width) and width.min() < 2 else 0 :]:
        together = group[start[width == members][:, None] + np.arange(members)]
        first, last = np.triu_indices(members, 1)
        codes.append(distinct((together[:, first] * count + together[:, last]).ravel()))
    code = distinct(np.concatenate(codes))
    lower = code // count
    return np.column_stack([lower, code - lower * count])


def tied_to_everything(row: IntArray, group: IntArray, pairs: IntArray, count: int) -> BoolArray:
    """Groups (count,) that would spoil any cut: those met by very many others, and those of very wide rows.

    The bound is that for dense rows in the approximate minimum degree ordering (Amestoy, Davis & Duff 2004, *ACM
    Transactions on Mathematical Software* 30, 381–388).
    """
    tied = np.bincount(pairs.ravel(), minlength=count) > max(16.0, DENSE_DEGREE * np.sqrt(count))
    width = np.bincount(row)
    tied[group[width[row] > WIDE_ROW]] = True
    return np.asarray(tied, dtype=bool)
