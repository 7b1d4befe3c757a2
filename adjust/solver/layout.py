"""Where every element of the matrix goes: the index arrays that fill the stacked fronts without a loop over rows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse

from adjust.arrays import IntArray
from adjust.solver.shapes import Shapes, gather_alike
from adjust.solver.staircases import Staircases, build_staircases
from adjust.solver.tree import Tree


@dataclass(frozen=True)
class Handover:
    """Fronts of batch `source` that leave rows and border columns over to fronts of batch `target`.

    Front `members[i]` of the source goes into front `into[i]` of the target: its row r to row `rows[i, r]` of the whole
    stack (the one behind the last where it has no row r), its border column c to column `columns[i, c]`; the last of
    the columns is the right-hand side, and so are those that only pad the source.
    """

    source: int
    target: int
    members: IntArray
    into: IntArray
    rows: IntArray
    columns: IntArray


@dataclass(frozen=True)
class Run:
    """Matrix rows of one batch that have the same number of elements, in the order of the layout."""

    rows: slice
    elements: slice
    width: int


@dataclass(frozen=True)
class Batch:
    """Fronts stacked in one array (fronts, rows, own + border + 1): own columns, border columns, right-hand side.

    `own` and `border` (fronts, …) are new column numbers, the number of columns where padded. `runs` are the batch's
    rows and elements of the matrix in the order of the layout, `row_targets` and `targets` their places in the stack
    and in the flat stack; `units` are the places of the ones of padded columns; `reach` (columns,) is how many rows of
    a front begin at or before each column, at most.
    """

    own: IntArray
    border: IntArray
    rows: int
    runs: tuple[Run, ...]
    row_targets: IntArray
    targets: IntArray
    units: IntArray
    reach: IntArray

    @property
    def shape(self) -> tuple[int, int, int]:
        """Fronts, own columns, border columns."""
        return len(self.own), self.own.shape[1], self.border.shape[1]

    @property
    def rows_here(self) -> slice:
        """The batch's share of the layout's rows."""
        return slice(self.runs[0].rows.start, self.runs[-1].rows.stop) if self.runs else slice(0, 0)

    @property
    def elements_here(self) -> slice:
        """The batch's share of the layout's elements."""
        return slice(self.runs[0].elements.start, self.runs[-1].elements.stop) if self.runs else slice(0, 0)


@dataclass(frozen=True)
class Layout:
    """All batches with what passes between them, and the order in which they take rows and elements of the matrix."""

    tree: Tree
    shapes: Shapes
    batches: tuple[Batch, ...]
    handovers: tuple[Handover, ...]
    rows: IntArray
    elements: IntArray

    @cached_property
    def from_children(self) -> tuple[tuple[Handover, ...], ...]:
        """The handovers into each batch."""
        return self.by_batch([hand.target for hand in self.handovers])

    @cached_property
    def to_parents(self) -> tuple[tuple[Handover, ...], ...]:
        """The handovers out of each batch."""
        return self.by_batch([hand.source for hand in self.handovers])

    def by_batch(self, numbers: list[int]) -> tuple[tuple[Handover, ...], ...]:
        """The handovers sorted into batches of the given numbers."""
        found: list[list[Handover]] = [[] for _ in self.batches]
        for number, hand in zip(numbers, self.handovers, strict=True):
            found[number].append(hand)
        return tuple(map(tuple, found))


def lay_out(tree: Tree, matrix: scipy.sparse.csr_array) -> Layout:
    """Place every element of a matrix of this pattern in the stacked fronts. Rows are taken by batch, then by width."""
    shapes = gather_alike(tree)
    width = np.diff(matrix.indptr).astype(np.int64)
    used = np.flatnonzero(width)
    order = np.argsort(shapes.home[tree.front_of_row[used]] * (width.max(initial=0) + 1) + width[used], kind="stable")
    rows = used[order]
    front, width = tree.front_of_row[rows], width[rows]
    offsets = np.concatenate([[0], np.cumsum(width)])
    elements = np.repeat(matrix.indptr[rows] - offsets[:-1], width) + np.arange(offsets[-1])
    column = tree.position(np.repeat(front, width), tree.place[matrix.indices[elements]], shapes.own)
    stairs = build_staircases(tree, shapes, rows, np.minimum.reduceat(column, offsets[:-1]) if len(rows) else rows)
    height = np.zeros(len(shapes.members), dtype=np.int64)
    np.maximum.at(height, shapes.home, np.maximum(stairs.rows, shapes.own))
    base = shapes.slot * height[shapes.home]
    targets = base[front] + stairs.row_slot
    batches = build_batches(tree, shapes, stairs, height, Share(shapes.home[front], width, offsets, targets, column))
    return Layout(tree, shapes, batches, build_handovers(tree, shapes, stairs, height), rows, elements)


@dataclass(frozen=True)
class Share:
    """Rows of the matrix in the order of the layout: batch, width, first element, row in the stack; columns."""

    home: IntArray
    width: IntArray
    offsets: IntArray
    targets: IntArray
    column: IntArray

    def runs(self, start: int, stop: int) -> tuple[Run, ...]:
        """Rows `start` to `stop` in runs of equal width."""
        starts = start + np.flatnonzero(np.diff(self.width[start:stop], prepend=0))
        ends = np.append(starts, stop)[1:]
        at = self.offsets
        return tuple(
            Run(slice(a, b), slice(int(at[a]), int(at[b])), int(self.width[a]))
            for a, b in zip(starts.tolist(), ends.tolist(), strict=True)
        )


def build_batches(tree: Tree, shapes: Shapes, stairs: Staircases, height: IntArray, share: Share) -> tuple[Batch, ...]:
    """Cut what was laid out for all fronts into batches."""
    numbers = np.arange(len(shapes.members) + 1)
    cuts = np.searchsorted(share.home, numbers).tolist()
    units, unit_cuts = place_units(shapes, stairs, height, numbers)
    batches = []
    for number, fronts in enumerate(shapes.members):
        start, stop = cuts[number], cuts[number + 1]
        elements = slice(int(share.offsets[start]), int(share.offsets[stop]))
        width = int(shapes.width[fronts[0]])
        rows = share.targets[start:stop]
        batch = Batch(
            own=padded_runs(tree.start, np.arange(tree.columns), fronts, tree.columns, int(shapes.own[fronts[0]])),
            border=padded_runs(tree.edge, tree.border, fronts, tree.columns, int(shapes.border[fronts[0]])),
            rows=int(height[number]),
            runs=share.runs(start, stop),
            row_targets=rows,
            targets=np.repeat(rows * width, share.width[start:stop]) + share.column[elements],
            units=units[unit_cuts[number] : unit_cuts[number + 1]],
            reach=stairs.reach[stairs.start[fronts][:, None] + np.arange(width)].max(axis=0),
        )
        batches.append(batch)
    return tuple(batches)


def place_units(shapes: Shapes, stairs: Staircases, height: IntArray, numbers: IntArray) -> tuple[IntArray, IntArray]:
    """Places in the flat stacks of the ones of padded columns, by batch, and where each batch's begin."""
    front = stairs.unit_front
    home = shapes.home[front]
    order = np.argsort(home, kind="stable")
    row = shapes.slot[front] * height[home] + stairs.unit_slot
    return (row * shapes.width[front] + stairs.unit_column)[order], np.searchsorted(home[order], numbers)


def build_handovers(tree: Tree, shapes: Shapes, stairs: Staircases, height: IntArray) -> tuple[Handover, ...]:
    """Every pair of batches of which one has children of the other."""
    child = np.flatnonzero((tree.parent >= 0) & (tree.border_sizes > 0))
    code = shapes.home[tree.parent[child]] * (len(height) + 1) + shapes.home[child]
    order = np.argsort(code, kind="stable")
    cuts = np.flatnonzero(np.diff(code[order])) + 1
    return tuple(hand_over(tree, shapes, stairs, height, part) for part in np.split(child[order], cuts) if len(part))


def hand_over(tree: Tree, shapes: Shapes, stairs: Staircases, height: IntArray, children: IntArray) -> Handover:
    """What `children`, all of one batch, hand to their parents, all of another."""
    parents = tree.parent[children]
    target = int(shapes.home[parents[0]])
    border, last = int(shapes.border[children[0]]), int(shapes.width[parents[0]]) - 1
    slots = padded_runs(tree.edge, stairs.hand_slot, children, -1, border)
    base = shapes.slot[parents][:, None] * height[target]
    return Handover(
        source=int(shapes.home[children[0]]),
        target=target,
        members=shapes.slot[children],
        into=shapes.slot[parents],
        rows=np.where(slots >= 0, base + slots, len(shapes.members[target]) * height[target]),
        columns=padded_runs(tree.edge, stairs.hand_column, children, last, border + 1),
    )


def padded_runs(edge: IntArray, values: IntArray, fronts: IntArray, filler: int, width: int) -> IntArray:
    """The fronts' runs of `values` as rows (fronts, width), `filler` behind the shorter ones."""
    steps = np.arange(width)
    inside = steps < (edge[fronts + 1] - edge[fronts])[:, None]
    result = np.full(inside.shape, filler)
    result[inside] = values[(edge[fronts][:, None] + steps)[inside]]
    return result
