"""Fronts of like shape are worked together: which go together, and the index arrays that fill their stacked blocks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.tree import Tree

STACK_BYTES = 4_000_000  # of one stack of fronts, so that it stays near the processor: see docs/performance.md
ALONE = 192  # columns: a front this large fills the processor by itself
STEP = 8  # columns: fronts whose sizes differ by less are padded to the same shape


@dataclass(frozen=True)
class Handover:
    """Where the rows that fronts of an earlier batch leave over go in this one.

    Block `members[i]` of batch `source` puts its rows at `rows[i]` (flat over the stack) and its columns at `columns[i]`.
    """

    source: int
    members: IntArray
    fronts: IntArray
    rows: IntArray
    columns: IntArray


@dataclass(frozen=True)
class Batch:
    """Fronts stacked in one array (fronts, rows, own + border + 1): own columns, border columns, right-hand side.

    `own` and `border` (fronts, …) are new column numbers, the number of columns where padded. `entries` says which
    numbers of the matrix go where in the flat stack; `units` are the places of the ones that stand for padded columns.
    """

    fronts: IntArray
    own: IntArray
    border: IntArray
    rows: int
    source_rows: IntArray
    target_rows: IntArray
    entries: IntArray
    targets: IntArray
    units: IntArray
    handovers: tuple[Handover, ...]

    @property
    def shape(self) -> tuple[int, int, int]:
        """Fronts, own columns, border columns."""
        return len(self.fronts), self.own.shape[1], self.border.shape[1]


def form_batches(tree: Tree, matrix: scipy.sparse.csr_array) -> tuple[Batch, ...]:
    """All fronts in batches, children before parents."""
    members = gather_alike(tree)
    home, slot = locate(members, tree.count)
    layout = Layout.of(tree, matrix, members)
    return tuple(layout.batch(fronts, home, slot) for fronts in members)


def heights(parent: IntArray) -> IntArray:
    """Height of each front above the leaves below it."""
    height = np.zeros(len(parent), dtype=np.int64)
    while True:
        child = np.flatnonzero(parent >= 0)
        raised = height.copy()
        np.maximum.at(raised, parent[child], height[child] + 1)
        if np.array_equal(raised, height):
            return height
        height = raised


def gather_alike(tree: Tree) -> list[IntArray]:
    """Lists of fronts of one height and nearly one shape, in working order."""
    own, outside = np.diff(tree.start), np.diff(tree.edge)
    alone = own + outside > ALONE
    padded = np.stack(
        [heights(tree.parent), -(-own // STEP), -(-outside // STEP), np.where(alone, np.arange(tree.count), -1)]
    )
    order = np.lexsort(padded[::-1])
    new = np.flatnonzero((np.diff(padded[:, order], axis=1) != 0).any(axis=0)) + 1
    lists = []
    for alike in np.split(order, new):
        width = int((own + outside)[alike].max())
        most = max(1, STACK_BYTES // (8 * width * (2 * width)))
        lists += [np.sort(alike)[at : at + most] for at in range(0, len(alike), most)]
    return lists


def locate(members: list[IntArray], count: int) -> tuple[IntArray, IntArray]:
    """Batch of each front and its number in the batch."""
    home, slot = np.empty(count, dtype=np.int64), np.empty(count, dtype=np.int64)
    for number, fronts in enumerate(members):
        home[fronts], slot[fronts] = number, np.arange(len(fronts))
    return home, slot


@dataclass(frozen=True)
class Layout:
    """The places of all rows and columns in their padded fronts."""

    tree: Tree
    own: IntArray
    outside: IntArray
    padded_own: IntArray
    padded_outside: IntArray
    handed: IntArray
    row_slot: IntArray
    unit_slot: IntArray
    hand_slot: IntArray
    hand_column: IntArray
    rows: IntArray
    entry_column: IntArray
    indptr: IntArray

    @staticmethod
    def of(tree: Tree, matrix: scipy.sparse.csr_array, members: list[IntArray]) -> Layout:
        """Place every row: in each front, sorted by first column, so that the block is a staircase."""
        own, outside = np.diff(tree.start), np.diff(tree.edge)
        padded_own, padded_outside = own.copy(), outside.copy()
        for fronts in members:
            padded_own[fronts], padded_outside[fronts] = own[fronts].max(), outside[fronts].max()

        def column_in(front: IntArray, column: IntArray) -> IntArray:
            position = tree.position(front, column)
            return np.where(position < own[front], position, position + (padded_own - own)[front])

        entry_row = np.repeat(np.arange(matrix.shape[0]), np.diff(matrix.indptr))
        entry_column = column_in(tree.front_of_row[entry_row], tree.place[matrix.indices])
        lead = np.full(matrix.shape[0], 1 << 40)
        np.minimum.at(lead, entry_row, entry_column)

        front_of_border = np.repeat(np.arange(tree.count), outside)
        above = tree.parent[front_of_border]
        hand_column = column_in(above, tree.border)
        pads = padded_own - own
        front_of_unit = np.repeat(np.arange(tree.count), pads)
        unit_column = own[front_of_unit] + np.arange(len(front_of_unit)) - np.repeat(np.cumsum(pads) - pads, pads)

        rows, handed = count_rows(tree, own, outside, pads)
        index = np.arange(len(tree.border)) - tree.edge[front_of_border]
        active = index < handed[front_of_border]
        front = np.concatenate([tree.front_of_row, above[active], front_of_unit])
        first = np.concatenate([lead, hand_column[active], unit_column])
        order = np.lexsort((first, front))
        slot = np.empty(len(order), dtype=np.int64)
        counts = np.bincount(front, minlength=tree.count)
        slot[order] = np.arange(len(order)) - np.repeat(np.cumsum(counts) - counts, counts)
        row_slot, hand_slot, unit_slot = np.split(slot, np.cumsum([matrix.shape[0], int(active.sum())]))
        every_hand = np.full(len(tree.border), -1)
        every_hand[active] = hand_slot
        return Layout(
            tree,
            own,
            outside,
            padded_own,
            padded_outside,
            handed,
            row_slot,
            unit_slot,
            every_hand,
            hand_column,
            rows,
            entry_column,
            matrix.indptr.astype(np.int64),
        )

    def batch(self, fronts: IntArray, home: IntArray, slot: IntArray) -> Batch:
        tree, none = self.tree, self.tree.columns
        own = ragged(tree.start, fronts, none)
        own = np.where(own < none, own, none)
        at, inside = ragged_index(tree.edge, fronts)
        border = np.where(inside, np.append(tree.border, none)[np.where(inside, at, 0)], none)
        width = own.shape[1] + border.shape[1] + 1
        height = int(max(self.rows[fronts].max(), own.shape[1]))
        number = np.full(tree.count, -1)
        number[fronts] = np.arange(len(fronts))
        rows = np.flatnonzero(number[tree.front_of_row] >= 0)
        target = number[tree.front_of_row[rows]] * height + self.row_slot[rows]
        counts = np.diff(self.indptr)[rows]
        entries = np.repeat(self.indptr[rows] - (np.cumsum(counts) - counts), counts) + np.arange(int(counts.sum()))
        targets = np.repeat(target, counts) * width + self.entry_column[entries]
        pads = self.padded_own - self.own
        front_of_unit = np.repeat(np.arange(tree.count), pads)
        mine = np.flatnonzero(number[front_of_unit] >= 0)
        unit_column = self.own[front_of_unit] + np.arange(len(front_of_unit)) - np.repeat(np.cumsum(pads) - pads, pads)
        units = (number[front_of_unit[mine]] * height + self.unit_slot[mine]) * width + unit_column[mine]
        children = np.flatnonzero((tree.parent >= 0) & (number[tree.parent] >= 0))
        handovers = []
        for source in np.unique(home[children]):
            kids = children[home[children] == source]
            at, inside = ragged_index(tree.edge, kids, int(self.padded_outside[kids[0]]))
            safe = np.where(inside, at, 0)
            slots = np.where(inside, self.hand_slot[safe] if len(self.hand_slot) else -1, -1)
            base = number[tree.parent[kids]][:, None]
            rows_to = np.where(slots >= 0, base * height + slots, len(fronts) * height)
            columns_to = np.where(inside, self.hand_column[safe] if len(self.hand_column) else 0, width)
            columns_to = np.column_stack([columns_to, np.full(len(kids), width - 1)])
            handovers.append(Handover(int(source), slot[kids], base[:, 0], rows_to, columns_to))
        return Batch(fronts, own, border, height, rows, target, entries, targets, units, tuple(handovers))


def count_rows(tree: Tree, own: IntArray, outside: IntArray, pads: IntArray) -> tuple[IntArray, IntArray]:
    """Rows of each front, padding included, and how many it hands up: no more than it has border columns."""
    rows = np.bincount(tree.front_of_row, minlength=tree.count) + pads
    handed = np.zeros_like(rows)
    for front in range(tree.count):
        handed[front] = max(0, min(outside[front], rows[front] - own[front] - pads[front]))
        if tree.parent[front] >= 0:
            rows[tree.parent[front]] += handed[front]
    return rows, handed


def ragged_index(edge: IntArray, fronts: IntArray, width: int | None = None) -> tuple[IntArray, IntArray]:
    """Indices (fronts, width) of the runs of the fronts, and which of them lie within their run."""
    size = edge[fronts + 1] - edge[fronts]
    steps = np.arange(int(size.max()) if width is None else width)
    return edge[fronts][:, None] + steps, steps < size[:, None]


def ragged(start: IntArray, fronts: IntArray, none: int) -> IntArray:
    """New column numbers (fronts, widest) owned by the fronts, `none` where padded."""
    at, inside = ragged_index(start, fronts)
    return np.where(inside, at, none)
