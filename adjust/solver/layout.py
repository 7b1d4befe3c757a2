"""Where every element of the matrix goes: the index arrays that fill the stacked fronts without a loop over rows."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
import scipy.sparse

from adjust.arrays import IntArray
from adjust.solver.shapes import Shapes, gather_alike
from adjust.solver.sorting import counted, offsets_of, rising
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

    @cached_property
    def consumed(self) -> tuple[tuple[int, ...], ...]:
        """By level: the batches whose handed rows no later level needs."""
        return self.by_level({hand.source: hand.target for hand in sorted(self.handovers, key=lambda h: h.target)})

    @cached_property
    def served(self) -> tuple[tuple[int, ...], ...]:
        """By level: the batches whose covariance no lower level needs."""
        return self.by_level({hand.target: hand.source for hand in sorted(self.handovers, key=lambda h: -h.source)})

    def by_level(self, last: dict[int, int]) -> tuple[tuple[int, ...], ...]:
        """Batches by the level of the last batch that needs them."""
        return tuple(tuple(number for number, user in last.items() if user in level) for level in self.shapes.levels)

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
    rows = used[rising(shapes.home[tree.front_of_row[used]] * (width.max(initial=0) + 1) + width[used])]
    front, width = tree.front_of_row[rows], width[rows]
    offsets = offsets_of(width)
    elements = np.repeat(matrix.indptr[rows] - offsets[:-1], width) + np.arange(offsets[-1])
    column = tree.position(np.repeat(front, width), tree.place[matrix.indices[elements]], shapes.own)
    stairs = build_staircases(tree, shapes, rows, np.minimum.reduceat(column, offsets[:-1]) if len(rows) else rows)
    height = np.zeros(len(shapes.members), dtype=np.int64)
    np.maximum.at(height, shapes.home, np.maximum(stairs.rows, shapes.own))
    targets = shapes.slot[front] * height[shapes.home[front]] + stairs.row_slot
    share = Share(shapes.home[front], width, offsets, targets, np.repeat(targets * shapes.width[front], width) + column)
    batches = build_batches(tree, shapes, stairs, height, share)
    return Layout(tree, shapes, batches, build_handovers(tree, shapes, stairs, height), rows, elements)


@dataclass(frozen=True)
class Share:
    """Rows of the matrix in the order of the layout: batch, width, first element, row in the stack; element targets."""

    home: IntArray
    width: IntArray
    offsets: IntArray
    row_targets: IntArray
    targets: IntArray

    def runs(self, batches: int) -> list[tuple[Run, ...]]:
        """The rows of every batch in runs of equal width."""
        found: list[list[Run]] = [[] for _ in range(batches)]
        new = (np.diff(self.home, prepend=-1) != 0) | (np.diff(self.width, prepend=-1) != 0)
        start = np.flatnonzero(new)
        bounds = np.append(start, len(new))
        for home, width, rows, elements in zip(
            self.home[start].tolist(),
            self.width[start].tolist(),
            pairwise(bounds.tolist()),
            pairwise(self.offsets[bounds].tolist()),
            strict=True,
        ):
            found[home].append(Run(slice(*rows), slice(*elements), width))
        return list(map(tuple, found))


def build_batches(tree: Tree, shapes: Shapes, stairs: Staircases, height: IntArray, share: Share) -> tuple[Batch, ...]:
    """Cut what was laid out for all fronts into batches."""
    count, order, none = len(shapes.members), shapes.in_order, tree.columns
    bounds, sizes, outside = offsets_of(shapes.fronts), shapes.own[order], shapes.border[order]
    own = stacked(padded_runs(tree.start, np.arange(none), order, sizes, none), bounds, sizes)
    border = stacked(padded_runs(tree.edge, tree.border, order, outside, none), bounds, outside)
    reach = stacked(stairs.reach, bounds, shapes.width[order])
    units = place_units(shapes, stairs, height)
    runs = share.runs(count)
    batches = []
    for number in range(count):
        rows, elements = whole(run.rows for run in runs[number]), whole(run.elements for run in runs[number])
        batch = Batch(
            own=own[number],
            border=border[number],
            rows=int(height[number]),
            runs=runs[number],
            row_targets=share.row_targets[rows],
            targets=share.targets[elements],
            units=units[number],
            reach=reach[number].max(axis=0),
        )
        batches.append(batch)
    return tuple(batches)


def whole(slices: Iterable[slice]) -> slice:
    """One slice from adjoining ones."""
    joined = list(slices)
    return slice(joined[0].start, joined[-1].stop) if joined else slice(0, 0)


def place_units(shapes: Shapes, stairs: Staircases, height: IntArray) -> list[IntArray]:
    """Places in the flat stack of each batch of the ones of padded columns."""
    front = stairs.unit_front
    home = shapes.home[front]
    place = (shapes.slot[front] * height[home] + stairs.unit_slot) * shapes.width[front] + stairs.unit_column
    order = rising(home)
    return np.split(place[order], np.searchsorted(home[order], np.arange(1, len(height))))


def build_handovers(tree: Tree, shapes: Shapes, stairs: Staircases, height: IntArray) -> tuple[Handover, ...]:
    """Every pair of batches of which one has children of the other."""
    child = np.flatnonzero((tree.parent >= 0) & (tree.border_sizes > 0))
    pair = shapes.home[tree.parent[child]] * (len(height) + 1) + shapes.home[child]
    order = rising(pair)
    child, pair = child[order], pair[order]
    parent, border = tree.parent[child], shapes.border[child]
    target = shapes.home[parent]
    slots = padded_runs(tree.edge, stairs.hand_slot, child, border, -1)
    base, behind = np.repeat(
        [shapes.slot[parent] * height[target], shapes.fronts[target] * height[target]], border, axis=1
    )
    rows = np.where(slots >= 0, base + slots, behind)
    columns = padded_runs(tree.edge, stairs.hand_column, child, border + 1, shapes.width[parent] - 1)
    bounds = np.append(np.flatnonzero(np.diff(pair, prepend=-1)), len(child))
    stacks = zip(stacked(rows, bounds, border), stacked(columns, bounds, border + 1), strict=True)
    return tuple(
        Handover(int(shapes.home[child[a]]), int(target[a]), shapes.slot[child[a:b]], shapes.slot[parent[a:b]], *stack)
        for (a, b), stack in zip(pairwise(bounds.tolist()), stacks, strict=True)
    )


def padded_runs(
    edge: IntArray, values: IntArray, fronts: IntArray, width: IntArray, filler: IntArray | int
) -> IntArray:
    """The fronts' runs of `values`, each lengthened to `width` by its `filler` (fronts,), end to end."""
    step = counted(width)
    inside = step < np.repeat(edge[fronts + 1] - edge[fronts], width)
    result = np.repeat(np.broadcast_to(filler, width.shape), width)
    result[inside] = values[(np.repeat(edge[fronts], width) + step)[inside]]
    return result


def stacked(flat: IntArray, bounds: IntArray, width: IntArray) -> list[IntArray]:
    """Stacks (fronts, width) of runs laid end to end: those from `bounds[i]` to `bounds[i + 1]`, of one width."""
    at = offsets_of(width)[bounds]
    return [
        flat[start:end].reshape(size, -1)
        for (start, end), size in zip(pairwise(at.tolist()), np.diff(bounds).tolist(), strict=True)
    ]
