"""The elimination tree of fronts: which columns each one owns, and which it borders on."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import IntArray
from adjust.solver.sorting import distinct, offsets_of, rising


@dataclass(frozen=True)
class Tree:
    """Fronts numbered children first. Columns are renumbered front by front: `order` old numbers, `place` new ones.

    Front f owns the new columns `start[f]` to `start[f + 1]`; its border columns are `border[edge[f]:edge[f + 1]]`, in
    rising order, all owned by its ancestors. `owner` is the front of each new column, `parent` is −1 at a root,
    `front_of_row` is where each row of the matrix is first used.
    """

    parent: IntArray
    start: IntArray
    order: IntArray
    place: IntArray
    owner: IntArray
    edge: IntArray
    border: IntArray
    front_of_row: IntArray

    @property
    def count(self) -> int:
        """Number of fronts."""
        return len(self.parent)

    @property
    def columns(self) -> int:
        """Number of columns."""
        return len(self.order)

    @cached_property
    def own_sizes(self) -> IntArray:
        """Own columns of each front."""
        return np.diff(self.start)

    @cached_property
    def border_sizes(self) -> IntArray:
        """Border columns of each front."""
        return np.diff(self.edge)

    @cached_property
    def front_of_border(self) -> IntArray:
        """Front of each element of `border`."""
        return np.repeat(np.arange(self.count), self.border_sizes)

    @cached_property
    def border_codes(self) -> IntArray:
        """Front and column of each element of `border` as one rising number, for look-up."""
        return self.front_of_border * self.columns + self.border

    def position(self, front: IntArray, column: IntArray, own_sizes: IntArray) -> IntArray:
        """Position of new `column` in its `front`: own columns (padded to `own_sizes`) first, then border columns.

        Raises ValueError where the front does not hold the column.
        """
        position = column - self.start[front]
        outside = np.flatnonzero(self.owner[column] != front)
        front, column = front[outside], column[outside]
        code = front * self.columns + column
        found = np.searchsorted(self.border_codes, code)
        if not np.array_equal(self.border_codes.take(found, mode="clip"), code):
            raise ValueError("two columns that share neither a row nor a group")
        position[outside] = found - self.edge[front] + own_sizes[front]
        return position


def grow_tree(node: IntArray, groups: IntArray, row: IntArray, group: IntArray, rows: int) -> Tree:
    """Fronts from the dissection node of each group, the group of each column, and the (row, group) incidence."""
    front_of_group, parent, depth = number_fronts(node)
    turn = np.empty(len(node), dtype=np.int64)
    turn[rising(front_of_group + 1)] = np.arange(len(node))
    order = rising(turn[groups])
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    front_of_turn = np.sort(front_of_group)
    owner = front_of_turn[turn[groups[order]]]
    front_of_row = np.full(rows, len(parent))
    np.minimum.at(front_of_row, row, front_of_group[group])
    incidence = front_of_row[row] * len(node) + turn[group]
    code = borders(distinct(incidence), parent, depth, front_of_turn)
    front = code // len(node)
    size = np.bincount(turn[groups], minlength=len(node))
    border, offsets = spread(np.cumsum(size) - size, size, code - front * len(node))
    edge = offsets[np.searchsorted(front, np.arange(len(parent) + 1))]
    start = np.searchsorted(owner, np.arange(len(parent) + 1))
    return Tree(parent, start, order, place, owner, edge, border, front_of_row)


def number_fronts(node: IntArray) -> tuple[IntArray, IntArray, IntArray]:
    """Front of each group (−1 for empty ones), parent (−1 for roots) and depth of each front, the deepest first."""
    used = distinct(node[node > 0])
    depth = np.frexp(used.astype(float))[1]
    order = rising(depth.max(initial=0) - depth.astype(np.int64))
    rank = np.empty(len(used), dtype=np.int64)
    rank[order] = np.arange(len(used))
    above = used // 2
    while True:
        at = np.minimum(np.searchsorted(used, above), len(used) - 1)
        missing = (above > 0) & (used[at] != above)
        if not missing.any():
            break
        above = np.where(missing, above // 2, above)
    parent = np.where(above > 0, rank[at], -1)[order]
    front = np.full(len(node), -1)
    front[node > 0] = rank[np.searchsorted(used, node[node > 0])]
    return front, parent, depth[order].astype(np.int64)


def borders(incidence: IntArray, parent: IntArray, depth: IntArray, front_of_turn: IntArray) -> IntArray:
    """Border groups of all fronts as rising codes front × groups + turn: from its rows and its children's borders."""
    count = len(front_of_turn)
    own_depth = depth[incidence // count]
    waiting = {level: [incidence[own_depth == level]] for level in range(int(depth.max(initial=0)) + 1)}
    found = [np.empty(0, dtype=np.int64)]
    for level in reversed(range(len(waiting))):
        code = distinct(np.concatenate(waiting[level]))
        front = code // count
        turn = code - front * count
        outside = front_of_turn[turn] > front
        found.append(code[outside])
        above = parent[front[outside]]
        code = above * count + turn[outside]
        for next_level in range(level):
            waiting[next_level].append(code[depth[above] == next_level])
    return np.sort(np.concatenate(found))


def spread(first: IntArray, size: IntArray, runs: IntArray) -> tuple[IntArray, IntArray]:
    """The members of runs with given first members and sizes, end to end, and where each run starts among them."""
    length = size[runs]
    offsets = offsets_of(length)
    return np.repeat(first[runs] - offsets[:-1], length) + np.arange(offsets[-1]), offsets
