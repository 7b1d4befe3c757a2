"""Where every element of the matrix goes: the index arrays that fill the stacked fronts without a loop over rows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver.shapes import Shapes, gather_alike
from adjust.solver.sorting import counted, offsets_of, rising
from adjust.solver.staircases import Staircases, build_staircases
from adjust.solver.tree import Tree


@dataclass(frozen=True)
class Handover:
    """Fronts of batch `source` that leave rows and border columns over to fronts of batch `target`.

    The source's fronts `members` give their border columns and right-hand side to the columns that begin at `starts`
    (fronts, border + 1) in the flat stack of the target, and their border's rows to `rows` (fronts, border) of these;
    they find the covariances of their border in rows that begin at `corners` (fronts, border) of the target's flat
    covariances, at `columns` (fronts, border). What only pads the source goes to the last row, which counts for
    nothing, and to the right-hand side before this is written; its covariance is that of some other column.
    """

    source: int
    target: int
    members: IntArray | slice
    rows: IntArray
    starts: IntArray
    columns: IntArray
    corners: IntArray

    def given(self, stack: FloatArray) -> FloatArray:
        """What the handing fronts have in a stack of the source."""
        return stack if isinstance(self.members, slice) else stack.take(self.members, axis=0)


@dataclass(frozen=True)
class Run:
    """Rows of the matrix in one batch that have the same number of elements, counted within the batch."""

    rows: slice
    elements: slice
    width: int


@dataclass(frozen=True)
class Batch:
    """Fronts stacked in one array (fronts, columns, depth), column by column as LAPACK wants them.

    The columns are own columns, border columns, right-hand side. Each front holds a triangle of as many rows, then the
    rows below it (see Staircases: `piles` and `wedges` (fronts,)), and a last one for what counts for nothing. `own`
    and `border` (fronts, …) are new column numbers, the number of columns where padded. `rows_here` and `elements_here`
    are the batch's share of the layout's rows and elements, `runs` the same by width. `slots` (rows,) is the front of
    each row, `columns` (elements,) the column of each element in its front; `targets` and `right_targets` are their
    places, and those of the rows' right-hand sides, in the flat stack; `units` those of the ones of padded columns.
    """

    own: IntArray
    border: IntArray
    depth: int
    piles: IntArray
    wedges: IntArray
    rows_here: slice
    elements_here: slice
    runs: tuple[Run, ...]
    slots: IntArray
    columns: IntArray
    targets: IntArray
    right_targets: IntArray
    units: IntArray

    @property
    def shape(self) -> tuple[int, int, int]:
        """Fronts, own columns, border columns."""
        return len(self.own), self.own.shape[1], self.border.shape[1]

    @property
    def stack(self) -> tuple[int, int, int]:
        """Shape of the stack: fronts, columns, depth."""
        count, own, border = self.shape
        return count, own + border + 1, self.depth

    @cached_property
    def row_of_element(self) -> IntArray:
        """Row, counted within the batch, of each of its elements."""
        return np.repeat(np.arange(len(self.slots)), self.row_sizes)

    @cached_property
    def row_starts(self) -> IntArray:
        """First element of each row."""
        return np.cumsum(self.row_sizes) - self.row_sizes

    @property
    def row_sizes(self) -> IntArray:
        """Elements of each row."""
        return np.concatenate([np.full(run.rows.stop - run.rows.start, run.width) for run in self.runs])


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
    lead = np.minimum.reduceat(column, offsets[:-1]) if len(rows) else rows
    stairs = build_staircases(tree, shapes, front, lead)
    share = Share(front, stairs.matrix_row, width, offsets, column)
    depth = depths(shapes, stairs)
    batches = build_batches(tree, shapes, stairs, depth, share)
    return Layout(tree, shapes, batches, build_handovers(tree, shapes, stairs, depth), rows, elements)


@dataclass(frozen=True)
class Share:
    """Rows of the matrix in the order of the layout: front, row in it, width, first element; elements: column."""

    front: IntArray
    row: IntArray
    width: IntArray
    offsets: IntArray
    column: IntArray

    def cuts(self, shapes: Shapes) -> tuple[IntArray, IntArray]:
        """Where the rows and the elements of each batch begin, and behind them where the last ones end."""
        rows = np.searchsorted(shapes.home[self.front], np.arange(len(shapes.members) + 1))
        return rows, self.offsets[rows]

    def runs(self, rows: slice) -> tuple[Run, ...]:
        """The rows of one batch in runs of equal width."""
        width = self.width[rows]
        bounds = np.append(np.flatnonzero(np.diff(width, prepend=-1)), len(width))
        ends = (offsets_of(width)[bounds]).tolist()
        sizes = width[bounds[:-1]].tolist()
        pieces = zip(pairwise(bounds.tolist()), pairwise(ends), sizes, strict=True)
        return tuple(Run(slice(*down), slice(*across), size) for down, across, size in pieces)


def build_batches(tree: Tree, shapes: Shapes, stairs: Staircases, depth: IntArray, share: Share) -> tuple[Batch, ...]:
    """Cut what was laid out for all fronts into batches."""
    order, none = shapes.in_order, tree.columns
    bounds, sizes, outside = offsets_of(shapes.fronts), shapes.own[order], shapes.border[order]
    own = stacked(padded_runs(tree.start, np.arange(none), order, sizes, none), bounds, sizes)
    border = stacked(padded_runs(tree.edge, tree.border, order, outside, none), bounds, outside)
    units = place_units(tree, shapes, depth)
    slots = shapes.slot[share.front]
    first = slots * shapes.width[share.front] * depth[share.front] + share.row
    right = first + (shapes.width[share.front] - 1) * depth[share.front]
    targets = np.repeat(first, share.width) + share.column * np.repeat(depth[share.front], share.width)
    batches = []
    row_cuts, element_cuts = share.cuts(shapes)
    for number, fronts in enumerate(shapes.members):
        rows = slice(int(row_cuts[number]), int(row_cuts[number + 1]))
        elements = slice(int(element_cuts[number]), int(element_cuts[number + 1]))
        batch = Batch(
            own=own[number],
            border=border[number],
            depth=int(depth[fronts[0]]),
            piles=stairs.piles[fronts],
            wedges=stairs.wedges[fronts],
            rows_here=rows,
            elements_here=elements,
            runs=share.runs(rows),
            slots=slots[rows],
            columns=share.column[elements],
            targets=targets[elements],
            right_targets=right[rows],
            units=units[number],
        )
        batches.append(batch)
    return tuple(batches)


def depths(shapes: Shapes, stairs: Staircases) -> IntArray:
    """Rows held for each front: the columns' triangle, the largest pile of the batch, and one for nothing."""
    highest = np.zeros(len(shapes.members), dtype=np.int64)
    np.maximum.at(highest, shapes.home, stairs.piles)
    return shapes.width + highest[shapes.home] + 1


def place_units(tree: Tree, shapes: Shapes, depth: IntArray) -> list[IntArray]:
    """Places in the flat stack of each batch of the ones of padded own columns: on the diagonals of the triangles."""
    padding = (shapes.own - tree.own_sizes)[shapes.in_order]
    front = np.repeat(shapes.in_order, padding)
    column = tree.own_sizes[front] + counted(padding)
    place = (shapes.slot[front] * shapes.width[front] + column) * depth[front] + column
    return np.split(place, np.searchsorted(shapes.home[front], np.arange(1, len(shapes.members))))


def build_handovers(tree: Tree, shapes: Shapes, stairs: Staircases, depth: IntArray) -> tuple[Handover, ...]:
    """Every pair of batches of which one has children of the other."""
    child = np.flatnonzero((tree.parent >= 0) & (tree.border_sizes > 0))
    pair = shapes.home[tree.parent[child]] * (len(shapes.members) + 1) + shapes.home[child]
    order = rising(pair)
    child, pair = child[order], pair[order]
    parent, border = tree.parent[child], shapes.border[child]
    each, last = np.repeat(parent, border), shapes.own + shapes.border
    rows = padded_runs(tree.edge, stairs.hand_row, child, border, depth[parent] - 1)
    columns = padded_runs(tree.edge, stairs.hand_column, child, border, last[parent])
    starts = (shapes.slot[each] * shapes.width[each] + columns) * depth[each]
    right = (shapes.slot[parent] * shapes.width[parent] + last[parent]) * depth[parent]
    found = np.minimum(columns, last[each] - 1)
    corners = (shapes.slot[each] * last[each] + found) * last[each]
    bounds = np.append(np.flatnonzero(np.diff(pair, prepend=-1)), len(child))
    stacks = zip(*(stacked(flat, bounds, border) for flat in (rows, starts, found, corners)), strict=True)
    handovers = []
    for (a, b), (down, across, at, corner) in zip(pairwise(bounds.tolist()), stacks, strict=True):
        source, target = int(shapes.home[child[a]]), int(shapes.home[parent[a]])
        members = slice(None) if b - a == len(shapes.members[source]) else shapes.slot[child[a:b]]
        columns_and_right = np.column_stack([across, right[a:b]])
        handovers.append(Handover(source, target, members, down, columns_and_right, at, corner))
    return tuple(handovers)


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
