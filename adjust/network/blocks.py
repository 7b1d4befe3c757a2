"""Blocks of a graph: the sets of marks that stay in one piece whichever single mark is taken out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components, depth_first_order

from adjust.arrays import IntArray


@dataclass(frozen=True)
class Blocks:
    """The tree of blocks of a graph of n marks.

    `block` (n,) names each mark's block by its top mark; −1 for a mark that stands alone or is the root of its piece.
    The block's top hangs on `parent` (n,), a mark that it shares with the block above. `number` (n,) counts the marks
    in the order of the search: marks below come later. `piece` (n,) labels the connected pieces.
    """

    block: IntArray
    parent: IntArray
    number: IntArray
    piece: IntArray

    @property
    def tops(self) -> IntArray:
        """The top marks of all blocks, the lowest blocks first."""
        tops = np.nonzero(self.block == np.arange(len(self.block)))[0]
        lowest_first: IntArray = tops[np.argsort(-self.number[tops])]
        return lowest_first

    def members(self) -> dict[int, IntArray]:
        """The marks of each block, by its top, without the mark that it hangs on."""
        inside = np.nonzero(self.block >= 0)[0]
        order = inside[np.argsort(self.block[inside], kind="stable")]
        tops, starts = np.unique(self.block[order], return_index=True)
        return dict(zip(tops.tolist(), np.split(order, starts[1:]), strict=True)) if len(tops) else {}

    def of_lines(self, ends: IntArray) -> IntArray:
        """Block (lines,) of each line of the graph by its two ends (lines, 2): that of the one lower down."""
        lower = np.where(self.number[ends[:, 0]] > self.number[ends[:, 1]], ends[:, 0], ends[:, 1])
        return self.block[lower]


def find_blocks(count: int, lines: IntArray) -> Blocks:
    """Blocks of the graph of `count` marks and `lines` (m, 2).

    Hopcroft & Tarjan (1973), *Communications of the ACM* 16(6), 372–378: below a mark hangs a block of its own wherever
    no line leads from the branch to above the mark.
    """
    root = count
    graph = csr_array((np.ones(len(lines)), (lines[:, 0], lines[:, 1])), shape=(count, count))
    label = connected_components(graph, directed=False)[1]
    entries = np.column_stack([np.full(label.max(initial=-1) + 1, root), np.unique(label, return_index=True)[1]])
    both = np.vstack([lines, lines[:, ::-1], entries])
    whole = csr_array((np.ones(len(both)), (both[:, 0], both[:, 1])), shape=(count + 1, count + 1))
    order, parent = depth_first_order(whole, root)
    number = np.empty(count + 1, dtype=np.int64)
    number[order] = np.arange(count + 1)
    highest = number.copy()
    np.minimum.at(highest, both[:, 0], number[both[:, 1]])
    np.minimum.at(highest, both[:, 1], number[both[:, 0]])
    block = _blocks_from_tree(order.tolist(), parent.tolist(), number.tolist(), highest.tolist())
    inner_parent = np.where(parent[:count] == root, -1, parent[:count]).astype(np.int64)
    return Blocks(np.array(block[:count], dtype=np.int64), inner_parent, number[:count], label.astype(np.int64))


def _blocks_from_tree(order: list[int], parent: list[int], number: list[int], highest: list[int]) -> list[int]:
    """Top mark of each mark's block; −1 for the roots. `highest` is the least number next to each mark."""
    for mark in reversed(order[1:]):
        highest[parent[mark]] = min(highest[parent[mark]], highest[mark])
    root = order[0]
    block = [-1] * len(order)
    for mark in order[1:]:
        above = parent[mark]
        if above != root:
            block[mark] = mark if highest[mark] >= number[above] else block[above]
    return block
