"""Nested dissection: cut the groups in two by a small separator, then each part, until the parts are small.

George 1973, *SIAM Journal on Numerical Analysis* 10, 345–363; all parts of a level are cut at once. Where every group
of a part has a position the cut is a straight line; elsewhere it runs between breadth-first levels of the graph.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray

LEAF_COLUMNS = 40  # parts of at most this many columns are not cut: measured, see docs/performance.md
IMBALANCE_PRICE = 0.5  # separator columns that a wholly one-sided cut must save, as a share of the smallest separator
MOST_LOPSIDED = 0.5  # a cut leaves at least a quarter on either side, which bounds the depth of the tree
SEPARATOR_SHARE = 0.6  # of a part: a separator larger than this gains nothing over leaving the part whole


@dataclass(frozen=True)
class Cut:
    """The best cut of each part along one ordering of its groups: where it is, and what it costs."""

    place: IntArray
    first: IntArray
    ahead: IntArray
    back: IntArray
    at: IntArray
    low_side: BoolArray
    cost: FloatArray


def dissect(pairs: IntArray, sizes: IntArray, positions: FloatArray, tied: BoolArray) -> IntArray:
    """Node of the dissection tree of each group: 1 is the root, node i is cut into 2 i and 2 i + 1; 0 for empty groups.

    `pairs` (pairs, 2) are groups that share a row, `sizes` (groups,) their columns, `positions` (groups, 2) may be NaN,
    `tied` groups are put into the root. No pair ever joins two nodes of which neither is an ancestor of the other.
    """
    node = np.where(sizes > 0, 1, 0)
    open_ = (sizes > 0) & ~tied
    pairs = pairs[open_[pairs].all(axis=1)]
    while True:
        open_ &= in_large_part(node, open_, sizes)
        members = np.flatnonzero(open_)
        if not len(members):
            return node
        pairs = pairs[open_[pairs].all(axis=1) & (node[pairs[:, 0]] == node[pairs[:, 1]])]
        settle_level(node, open_, members, pairs, sizes, positions)


def in_large_part(node: IntArray, open_: BoolArray, sizes: IntArray) -> BoolArray:
    """Groups whose part is still to be cut."""
    _, part = np.unique(node, return_inverse=True)
    return np.bincount(part, np.where(open_, sizes, 0))[part] > LEAF_COLUMNS


def settle_level(
    node: IntArray, open_: BoolArray, members: IntArray, pairs: IntArray, sizes: IntArray, positions: FloatArray
) -> None:
    """Cut every open part once: separators and parts not worth cutting are settled, the others move to child nodes."""
    _, part = np.unique(node[members], return_inverse=True)
    local = np.full(len(node), -1)
    local[members] = np.arange(len(members))
    ends = local[pairs]
    weight = sizes[members]
    cuts = [best_cuts(key, part, ends, weight) for key in orderings(positions[members], part, ends)]
    cost = np.stack([cut.cost for cut in cuts])
    best = np.argmin(cost, axis=0)
    separator, high = (np.zeros(len(members), dtype=bool) for _ in range(2))
    for number, cut in enumerate(cuts):
        mine = best[part] == number
        above = cut.place >= cut.at[part]
        crossing = np.where(above, cut.back < cut.at[part], cut.ahead >= cut.at[part])
        separator |= mine & crossing & (above != cut.low_side[part])
        high |= mine & above
    whole = np.bincount(part, weight)
    settled = ~(np.bincount(part, weight * separator) <= SEPARATOR_SHARE * whole)[part]
    settled |= np.isinf(cost.min(axis=0))[part]
    moving = ~(separator | settled)
    node[members[moving]] = 2 * node[members[moving]] + high[moving]
    open_[members[~moving]] = False


def orderings(positions: FloatArray, part: IntArray, ends: IntArray) -> list[FloatArray]:
    """Keys (members,) along which the parts may be cut: east and north, or breadth-first order where those are unknown."""
    unknown = np.isnan(positions).any(axis=1)
    if not unknown.any():
        return [positions[:, 0], positions[:, 1]]
    drawn = np.bincount(part, unknown)[part] == 0
    if not drawn.any():
        return [breadth_first_places(part, ends)]
    walked = breadth_first_places(part, ends)
    return [np.where(drawn, positions[:, axis], walked) for axis in range(2)]


def best_cuts(key: FloatArray, part: IntArray, ends: IntArray, weight: IntArray) -> Cut:
    """The cheapest cut of every part along `key`, from the separator sizes of all cuts at once.

    A group below a cut is on its low separator when a neighbour lies at or above the cut, so it counts for the cuts
    from its own place to its farthest neighbour's: a running sum over those intervals gives the size for every cut.
    """
    count = len(part)
    order = np.lexsort((key, part))
    place = np.empty(count, dtype=np.int64)
    place[order] = np.arange(count)
    ahead, back = place.copy(), place.copy()
    here, there = place[ends[:, 0]], place[ends[:, 1]]
    np.maximum.at(ahead, ends[:, 0], there)
    np.maximum.at(ahead, ends[:, 1], here)
    np.minimum.at(back, ends[:, 0], there)
    np.minimum.at(back, ends[:, 1], here)
    low = running_weight(place, ahead, weight)
    high = running_weight(back, place, weight)
    first = np.flatnonzero(np.diff(part[order], prepend=-1))
    below = np.concatenate([[0], np.cumsum(weight[order])])
    total = np.diff(below[np.append(first, count)])
    lopsided = np.abs(2.0 * (below[:-1] - below[first][part[order]]) / total[part[order]] - 1.0)
    smaller = np.minimum(low, high)
    least = np.sqrt(total)[part[order]]
    price = np.where(lopsided > MOST_LOPSIDED, np.inf, smaller + IMBALANCE_PRICE * least * lopsided**2)
    ranked = np.lexsort((price, part[order]))[first]
    return Cut(place, first, ahead, back, ranked, low[ranked] <= high[ranked], price[ranked])


def running_weight(start: IntArray, end: IntArray, weight: IntArray) -> IntArray:
    """For every cut c, the weight of the members with start < c ≤ end."""
    steps = np.bincount(start + 1, weight, len(start) + 1) - np.bincount(end + 1, weight, len(start) + 1)
    return np.cumsum(steps)[:-1].astype(np.int64)


def breadth_first_places(part: IntArray, ends: IntArray) -> FloatArray:
    """Order of the members, component by component, by breadth-first search from an end of each component."""
    import scipy.sparse
    from scipy.sparse.csgraph import breadth_first_order, connected_components

    count = len(part)
    graph = scipy.sparse.csr_array((np.ones(len(ends)), (ends[:, 0], ends[:, 1])), shape=(count, count))
    pieces, piece = connected_components(graph, directed=False)
    start = np.full(pieces, count)
    np.minimum.at(start, piece, np.arange(count))
    for _ in range(2):  # the second search starts from the farthest member of the first
        sources = np.column_stack([np.full(pieces, count), start])
        joined = np.concatenate([ends, sources])
        whole = scipy.sparse.csr_array(
            (np.ones(len(joined)), (joined[:, 0], joined[:, 1])), shape=(count + 1, count + 1)
        )
        order = breadth_first_order(whole, count, directed=False, return_predecessors=False)[1:]
        start[piece[order]] = order
    place = np.empty(count)
    place[order] = np.arange(count)
    return piece * float(count) + place
