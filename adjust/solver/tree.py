"""The elimination tree of fronts: what each owns, what it borders on, and where everything goes in its dense block."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import IntArray


@dataclass(frozen=True)
class Tree:
    """Fronts numbered children first. Columns are renumbered front by front: `order` old numbers, `place` new ones.

    Front f owns the new columns `start[f]` to `start[f + 1]`; its border columns are `border[edge[f]:edge[f + 1]]`, in
    rising order, all owned by its ancestors. `front_of_row` is where each row of the matrix is first used.
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

    def position(self, front: IntArray, column: IntArray) -> IntArray:
        """Position of new `column` within `front`: own columns first, then border columns."""
        own = column - self.start[front]
        size = np.diff(self.start)[front]
        inside = (own >= 0) & (own < size)
        code = np.repeat(np.arange(self.count), np.diff(self.edge)) * self.columns + self.border
        outside = np.searchsorted(code, front * self.columns + column) - self.edge[front]
        return np.where(inside, own, size + outside)


def grow_tree(node: IntArray, groups: IntArray, row: IntArray, group: IntArray, rows: int) -> Tree:
    """Fronts from the dissection node of each group, the group of each column, and the (row, group) incidence."""
    front_of_group, parent = number_fronts(node)
    order = np.lexsort((groups, front_of_group[groups]))
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    owner = front_of_group[groups[order]]
    start = np.searchsorted(owner, np.arange(len(parent) + 1))
    front_of_row = np.full(rows, len(parent) - 1)  # where rows without columns go, as between two held marks
    np.minimum.at(front_of_row, row, front_of_group[group])
    edge, border_group = borders(parent, front_of_group, front_of_row[row], group)
    size = np.bincount(groups, minlength=len(node))
    first = np.full(len(node), len(order))
    np.minimum.at(first, groups[order], np.arange(len(order)))
    border, edge = spread(first[border_group], size[border_group], edge)
    return Tree(parent, start, order, place, owner, edge, border, front_of_row)


def number_fronts(node: IntArray) -> tuple[IntArray, IntArray]:
    """Front of each group (−1 for empty ones) and parent of each front (−1 for roots), the deepest fronts first."""
    used = np.unique(node[node > 0])
    depth = np.frexp(used.astype(float))[1]
    rank = np.empty(len(used), dtype=np.int64)
    rank[np.lexsort((used, -depth))] = np.arange(len(used))
    above = used // 2
    while True:
        at = np.minimum(np.searchsorted(used, above), len(used) - 1)
        missing = (above > 0) & (used[at] != above)
        if not missing.any():
            break
        above = np.where(missing, above // 2, above)
    parent = np.empty_like(rank)
    parent[rank] = np.where(above > 0, rank[at], -1)
    front = np.full(len(node), -1)
    front[node > 0] = rank[np.searchsorted(used, node[node > 0])]
    return front, parent


def borders(parent: IntArray, front_of_group: IntArray, front: IntArray, group: IntArray) -> tuple[IntArray, IntArray]:
    """Groups that border on each front, front by front (offsets, groups): those of its rows and of its children."""
    count = len(front_of_group)
    new = np.unique(front * count + group)
    found = []
    while len(new):
        front, group = new // count, new % count
        outside = front_of_group[group] > front
        front, group = front[outside], group[outside]
        found.append(front * count + group)
        new = np.setdiff1d(np.unique(parent[front] * count + group), np.concatenate(found), assume_unique=True)
    code = np.unique(np.concatenate(found)) if found else np.empty(0, dtype=np.int64)
    front, group = code // count, code % count
    sorted_ = np.lexsort((group, front_of_group[group], front))
    return np.searchsorted(front, np.arange(len(parent) + 1)), group[sorted_]


def spread(first: IntArray, size: IntArray, edge: IntArray) -> tuple[IntArray, IntArray]:
    """Columns of runs of groups, and the offsets of the runs counted in columns."""
    end = np.cumsum(size)
    columns = np.repeat(first - (end - size), size) + np.arange(int(end[-1]) if len(end) else 0)
    return columns, np.concatenate([[0], end])[edge]
