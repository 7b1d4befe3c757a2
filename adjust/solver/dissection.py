"""Nested dissection: cut the groups in two by a small separator, then each part, until the parts are small.

George 1973, *SIAM Journal on Numerical Analysis* 10, 345–363; all parts of a level are cut at once. Where every group
of a part has a position the cut is a straight line; elsewhere it follows breadth-first search through the graph.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.solver.sorting import rising

LEAF_COLUMNS = 48  # parts of at most this many columns are not cut: measured, see docs/performance.md
IMBALANCE_PRICE = 0.5  # × √columns: what a wholly one-sided cut would have to save in separator columns
MOST_LOPSIDED = 0.5  # a cut leaves at least a quarter on either side, which bounds the depth of the tree
POOR = 4.0  # × √columns: twice the separator of a plane network; beyond it hubs are looked for
SEPARATOR_SHARE = 0.6  # of a part: a separator larger than this gains nothing over leaving the part whole


@dataclass(frozen=True)
class Level:
    """The open parts of one level: `members` numbered by part, their `ends` (pairs, 2) that meet, their `weight`."""

    members: IntArray
    part: IntArray
    parts: int
    ends: IntArray
    weight: IntArray


def dissect(pairs: IntArray, sizes: IntArray, positions: FloatArray | None, tied: BoolArray) -> IntArray:
    """Node of the dissection tree of each group: 1 is the root, node i is cut into 2 i and 2 i + 1; 0 for empty groups.

    `pairs` (pairs, 2) are groups that share a row, `sizes` (groups,) their columns, `positions` (groups, 2) may be NaN,
    `tied` groups are put into the root. No pair ever joins two nodes of which neither is an ancestor of the other.
    """
    node = np.where(sizes > 0, 1, 0)
    lie = np.full((2, len(sizes)), np.nan) if positions is None else np.ascontiguousarray(positions.T)
    turns = np.array([ranks(np.argsort(along, kind="stable")) for along in lie])
    moving = np.flatnonzero((sizes > 0) & ~tied)
    part, ends = np.zeros_like(moving), np.ascontiguousarray(pairs.T)
    while True:
        level = open_level(moving, part, ends, sizes)
        if not len(level.members):
            return node
        ends = level.members.take(level.ends.T)
        order = line_up(level, lie.take(level.members, axis=1), turns.take(level.members, axis=1))
        moving, part = cut_level(node, level, order)


def ranks(order: IntArray) -> IntArray:
    """Place of each member in an order."""
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    return place


def open_level(moving: IntArray, part: IntArray, ends: IntArray, sizes: IntArray) -> Level:
    """The parts still to be cut, given the groups `moving`, a number for the `part` of each, and ends (2, pairs)."""
    order = rising(part)
    members, part = moving[order], part[order]
    part = np.cumsum(np.diff(part, prepend=-1) > 0) - 1
    large = np.bincount(part, sizes[members]) > LEAF_COLUMNS
    kept = np.flatnonzero(large[part])
    members, part = members[kept], (np.cumsum(large) - 1)[part[kept]]
    number, home = np.full((2, len(sizes)), -1)
    number[members], home[members] = np.arange(len(members)), part
    first, second = home.take(ends)
    inside = np.flatnonzero((first == second) & (first >= 0))
    return Level(members, part, int(np.count_nonzero(large)), number.take(ends.take(inside, axis=1)).T, sizes[members])


def cut_level(node: IntArray, level: Level, order: IntArray) -> tuple[IntArray, IntArray]:
    """Cut every part once along `order`. Separators and parts not worth cutting stay.

    Returns the groups moved on to child nodes and a number for the part that each of them is in.
    """
    above, separator = best_cuts(level, order)
    total = np.bincount(level.part, level.weight)
    poor = np.bincount(level.part, level.weight * separator) > POOR * np.sqrt(total)
    if poor.any():
        separator = np.where(poor[level.part], smallest_cover(level, above), separator)
    split = np.bincount(level.part, above & ~separator) * np.bincount(level.part, ~above & ~separator) > 0
    worth = split & (np.bincount(level.part, level.weight * separator) <= SEPARATOR_SHARE * total)
    moves = np.flatnonzero(~separator & worth[level.part])
    moved = level.members[moves]
    node[moved] = 2 * node[moved] + above[moves]
    return moved, 2 * level.part[moves] + above[moves]


def line_up(level: Level, lie: FloatArray, turns: IntArray) -> IntArray:
    """Order in which to cut each part: along its longer extent, or breadth first where a position is unknown.

    `lie` (2, members) are the coordinates along two axes, `turns` (2, members) the members' turns in their order.
    """
    first = np.searchsorted(level.part, np.arange(level.parts))
    extent = np.maximum.reduceat(lie, first, axis=1) - np.minimum.reduceat(lie, first, axis=1)
    turn = np.where((extent[0] >= extent[1])[level.part], turns[0], turns[1])
    unknown = np.isnan(extent).any(axis=0)
    if unknown.any():
        turn = np.where(unknown[level.part], ranks(rising(breadth_first_places(level))), turn)
    return rising(level.part * (turn.max() + 1) + turn)


def best_cuts(level: Level, order: IntArray) -> tuple[BoolArray, BoolArray]:
    """Cut every part where it is cheapest along `order`, from the separator sizes of all cuts at once.

    Returns who is above the cut and who is on the separator (members,), all on one side of it. A member below a cut is
    on its lower separator when a neighbour lies at or above the cut, so it counts for the cuts from its own place to
    its farthest neighbour's: a running sum over those intervals gives the size for every cut.
    """
    count, part, place = len(level.members), level.part, ranks(order)
    ahead, back = farthest_neighbours(place, level.ends)
    low, high = running_weight(place, ahead, level.weight), running_weight(back, place, level.weight)
    first = np.searchsorted(part, np.arange(level.parts))
    below = np.concatenate([[0], np.cumsum(level.weight[order])])
    total = np.diff(below[np.append(first, count)])
    lopsided = np.abs(2.0 * (below[:-1] - below[first][part]) / total[part] - 1.0)
    price = np.minimum(low, high) + (IMBALANCE_PRICE * np.sqrt(total))[part] * lopsided**2
    price[lopsided > MOST_LOPSIDED] = np.inf
    least = np.minimum.reduceat(price, first)
    hits = np.flatnonzero(price == least[part])
    cut = hits[np.searchsorted(part[hits], np.arange(level.parts))]
    above = place >= cut[part]
    crossing = np.where(above, back < cut[part], ahead >= cut[part])
    return above, crossing & (above != (low <= high)[cut][part])


def smallest_cover(level: Level, above: BoolArray) -> BoolArray:
    """The fewest members, on either side, that touch every pair across the cuts: few hubs rather than many spokes.

    From a maximum matching of the pairs across, by the theorem of Kőnig (Papadimitriou & Steiglitz 1982, *Combinatorial
    Optimization*, section 10.2): those above that alternating paths reach from unmatched ones below, and those below
    that none reaches.
    """
    from scipy.sparse.csgraph import maximum_bipartite_matching

    count = len(level.members)
    across = level.ends[above[level.ends[:, 0]] != above[level.ends[:, 1]]]
    across = np.where(above[across[:, :1]], across[:, ::-1], across)
    mate = maximum_bipartite_matching(joined(across, count), perm_type="column")
    below, matched = np.zeros(count, dtype=bool), np.flatnonzero(mate >= 0)
    below[across[:, 0]] = True
    reached = below & (mate < 0)
    while True:
        reached[across[reached[across[:, 0]], 1]] = True
        fresh = matched[reached[mate[matched]] & ~reached[matched]]
        if not len(fresh):
            return np.asarray((below & ~reached) | (above & reached))
        reached[fresh] = True


def farthest_neighbours(place: IntArray, ends: IntArray) -> tuple[IntArray, IntArray]:
    """Highest and lowest place among each member and its neighbours."""
    ahead, back = place.copy(), place.copy()
    for here, there in (ends.T, ends.T[::-1]):
        np.maximum.at(ahead, here, place[there])
        np.minimum.at(back, here, place[there])
    return ahead, back


def running_weight(start: IntArray, end: IntArray, weight: IntArray) -> IntArray:
    """For every cut c, the weight of the members with start < c ≤ end."""
    count = len(start)
    steps = np.bincount(start + 1, weight, count + 2) - np.bincount(end + 1, weight, count + 2)
    return np.cumsum(steps[:count]).astype(np.int64)


def breadth_first_places(level: Level) -> IntArray:
    """Order of the members by breadth-first search from an end of each component, one component after the other."""
    from scipy.sparse.csgraph import breadth_first_order, connected_components

    count = len(level.members)
    pieces, piece = connected_components(joined(level.ends, count), directed=False)
    start = np.full(pieces, count)
    np.minimum.at(start, piece, np.arange(count))
    for _ in range(2):  # the second search starts from the last member that the first one reached
        everything = np.concatenate([level.ends, np.column_stack([start, np.full(pieces, count)])])
        order = breadth_first_order(joined(everything, count + 1), count, directed=False, return_predecessors=False)[1:]
        start[piece[order]] = order
    return np.asarray(piece * np.int64(count) + ranks(order))


def joined(ends: IntArray, count: int) -> scipy.sparse.csr_array:
    """Graph with the given ends of its edges."""
    return scipy.sparse.csr_array((np.ones(len(ends)), (ends[:, 0], ends[:, 1])), shape=(count, count))
