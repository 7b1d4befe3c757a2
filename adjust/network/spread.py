"""Values that follow from known ones along a chain of observed differences: heights, offsets of rounds."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import breadth_first_order

from adjust.arrays import FloatArray, IntArray
from adjust.network.consensus import group_medians


def spread(known: FloatArray, first: IntArray, second: IntArray, difference: FloatArray) -> FloatArray:
    """Values (n,) reached from the known ones (n,) (NaN: not known) in the fewest steps; NaN where nothing leads.

    Each row says value[second] − value[first] = difference. Of a line observed more than once the median counts; known
    values stay as they are.
    """
    count = len(known)
    root = count
    sources = np.nonzero(~np.isnan(known))[0]
    forward = np.concatenate([first, second]) * count + np.concatenate([second, first])
    lines, step = group_medians(forward, np.concatenate([difference, -difference]))
    tails = np.concatenate([lines // count, np.full(len(sources), root)])
    heads = np.concatenate([lines % count, sources])
    graph = csr_array((np.ones(len(tails)), (tails, heads)), shape=(count + 1, count + 1))
    parent = breadth_first_order(graph, root, return_predecessors=True)[1][:count].astype(np.int64)
    reached = parent >= 0
    value = np.where(reached, 0.0, np.nan)
    value[sources] = known[sources]
    derived = reached & (parent != root)
    value[derived] = step[np.searchsorted(lines, parent[derived] * count + np.nonzero(derived)[0])]
    return _summed_to_root(value, np.where(derived, parent, -1))


def _summed_to_root(step: FloatArray, parent: IntArray) -> FloatArray:
    """Sums (n,) of the steps along the way to each node's root (parent −1), by doubling the stride each time."""
    total, ahead = step.copy(), parent.copy()
    while np.any(climbing := ahead >= 0):
        total[climbing] += total[ahead[climbing]]
        ahead[climbing] = ahead[ahead[climbing]]
    return total
