"""Which groups of columns meet in a row: the graph that the dissection cuts."""

from __future__ import annotations

import numpy as np
import scipy.sparse

from adjust.arrays import BoolArray, FloatArray, IntArray

WIDE_ROW = 32  # groups: a row over more of them would make hundreds of pairs; its groups go to the root instead


def groups_of_rows(matrix: scipy.sparse.csr_array, groups: IntArray, count: int) -> tuple[IntArray, IntArray]:
    """Each row's distinct groups, as parallel arrays (row, group) sorted by row and group."""
    row = np.repeat(np.arange(matrix.shape[0]), np.diff(matrix.indptr))
    code = np.unique(row * count + groups[matrix.indices])
    return code // count, code % count


def meeting_pairs(row: IntArray, group: IntArray, count: int) -> IntArray:
    """Distinct pairs (pairs, 2) of groups, lower first, that share a row; rows over WIDE_ROW groups are left out."""
    start = np.flatnonzero(np.diff(row, prepend=-1))
    width = np.diff(start, append=len(row))
    codes = [np.empty(0, dtype=np.int64)]
    for members in np.unique(width[(width > 1) & (width <= WIDE_ROW)]):
        together = group[start[width == members][:, None] + np.arange(members)]
        first, last = np.triu_indices(members, 1)
        codes.append((together[:, first] * count + together[:, last]).ravel())
    code = np.unique(np.concatenate(codes))
    return np.column_stack([code // count, code % count])


def tied_to_everything(row: IntArray, group: IntArray, pairs: IntArray, count: int) -> BoolArray:
    """Groups (count,) that would spoil any cut: those met by very many others, and those of very wide rows.

    The bound 10 √n on the number of neighbours is that for dense rows in the approximate minimum degree ordering
    (Amestoy, Davis & Duff 2004, *ACM Transactions on Mathematical Software* 30, 381–388).
    """
    tied = np.bincount(pairs.ravel(), minlength=count) > max(16.0, 10.0 * np.sqrt(count))
    width = np.bincount(row)
    tied[group[width[row] > WIDE_ROW]] = True
    return tied


def places_known(positions: FloatArray | None, count: int) -> FloatArray:
    """Positions (count, 2), NaN throughout where none are given."""
    return np.full((count, 2), np.nan) if positions is None else np.asarray(positions, dtype=float)
