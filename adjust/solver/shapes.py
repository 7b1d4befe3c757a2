"""Which fronts are worked together: those of one height in the tree and nearly one shape, padded to the largest."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from adjust.arrays import IntArray
from adjust.solver.tree import Tree

STACK_ELEMENTS = 1 << 20  # in one stack of fronts: eight megabytes; most kinds of fronts then make one stack
ALONE = 240  # columns: a front this large keeps the processor busy by itself, so that padding could only cost
STEP = 16  # columns: fronts whose sizes differ by less are padded to the same shape; see docs/performance.md


@dataclass(frozen=True)
class Shapes:
    """Fronts by batch, batches by level; batch `home`, number in it `slot` and padded `own` and `border` of each front.

    Batches of one level (range of batch numbers) do not depend on one another; lower levels come first.
    """

    members: tuple[IntArray, ...]
    levels: tuple[range, ...]
    home: IntArray
    slot: IntArray
    own: IntArray
    border: IntArray

    @cached_property
    def fronts(self) -> IntArray:
        """Number of fronts in each batch."""
        return np.array([len(fronts) for fronts in self.members], dtype=np.int64)

    @cached_property
    def in_order(self) -> IntArray:
        """All fronts in working order."""
        return np.concatenate([np.empty(0, dtype=np.int64), *self.members])

    @cached_property
    def width(self) -> IntArray:
        """Columns of each front's block, the right-hand side included."""
        return self.own + self.border + 1


def gather_alike(tree: Tree) -> Shapes:
    """Batches of all fronts, those of the lowest level first, none larger than STACK_ELEMENTS."""
    own, border, height = tree.own_sizes, tree.border_sizes, heights(tree.parent)
    alone = np.where(own + border > ALONE, np.arange(tree.count) + 1, 0)
    kinds = np.stack([height, alone, own // -STEP, border // -STEP])  # the largest first: the smallest fill the end
    order = np.lexsort(kinds[::-1])
    members: list[IntArray] = []
    for alike in np.split(order, np.flatnonzero((np.diff(kinds[:, order]) != 0).any(axis=0)) + 1):
        size = int((own + border)[alike].max(initial=1))
        most = max(1, STACK_ELEMENTS // (2 * size * size))
        members += [np.sort(alike)[at : at + most] for at in range(0, len(alike), most)]
    level = np.array([height[fronts[0]] for fronts in members], dtype=np.int64)
    ends = np.searchsorted(level, np.arange(level.max(initial=-1) + 2)).tolist()
    return pad_alike(tree, members, tuple(range(a, b) for a, b in pairwise(ends)))


def heights(parent: IntArray) -> IntArray:
    """Height of each front above the leaves below it."""
    height = np.zeros(len(parent), dtype=np.int64)
    child = np.flatnonzero(parent >= 0)
    while True:
        raised = height.copy()
        np.maximum.at(raised, parent[child], height[child] + 1)
        if np.array_equal(raised, height):
            return height
        height = raised


def pad_alike(tree: Tree, members: list[IntArray], levels: tuple[range, ...]) -> Shapes:
    """Give all fronts of a batch the size of its largest."""
    home, slot, own, border = (np.zeros(tree.count, dtype=np.int64) for _ in range(4))
    for number, fronts in enumerate(members):
        home[fronts], slot[fronts] = number, np.arange(len(fronts))
        own[fronts], border[fronts] = tree.own_sizes[fronts].max(), tree.border_sizes[fronts].max()
    return Shapes(tuple(members), levels, home, slot, own, border)
