"""Loops of observed differences: rises or vectors that lead from mark to mark and have to sum to nothing."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.short_cycles import Cycles, short_cycles


@dataclass(frozen=True)
class Differences:
    """Differences `value` (edges, components), second mark minus first, of `marks` (edges, 2).

    `covariance` (edges, components, components), `length` (edges,) metres, NaN where unknown, `rows` the observations
    behind each.
    """

    marks: IntArray
    value: FloatArray
    covariance: FloatArray
    length: FloatArray
    rows: Ragged

    def __len__(self) -> int:
        return len(self.marks)

    def upward(self) -> Differences:
        """Each from the lower to the higher numbered mark."""
        backwards = self.marks[:, 0] > self.marks[:, 1]
        value = np.where(backwards[:, None], -self.value, self.value)
        return replace(self, marks=np.sort(self.marks, axis=1), value=value)

    def means(self) -> Differences:
        """One for each pair of marks: the plain mean of its runs, whichever way they went."""
        runs = self.upward()
        pairs, pair = np.unique(runs.marks, axis=0, return_inverse=True)
        groups = Ragged.grouped(pair.ravel(), len(pairs))
        count = groups.lengths.astype(np.float64)
        value = groups.total(runs.value[groups.values]) / count[:, None]
        covariance = groups.total(runs.covariance[groups.values]) / (count**2)[:, None, None]
        length = groups.total(runs.length[groups.values]) / count
        rows = runs.rows.take(groups.values)
        starts = rows.starts[groups.starts]
        return Differences(pairs.astype(np.int64), value, covariance, length, Ragged(rows.values, starts))

    def repeats(self) -> Differences:
        """Every further run between two marks minus the first one: `value` is the disagreement."""
        runs = self.upward()
        pairs, pair = np.unique(runs.marks, axis=0, return_inverse=True)
        groups = Ragged.grouped(pair.ravel(), len(pairs))
        first = np.repeat(groups.values[groups.starts[:-1]], groups.lengths)
        later = first != groups.values
        one, other = first[later], groups.values[later]
        return Differences(
            runs.marks[one],
            runs.value[other] - runs.value[one],
            runs.covariance[one] + runs.covariance[other],
            0.5 * (runs.length[one] + runs.length[other]),
            Ragged.of([[*runs.rows[i], *runs.rows[j]] for i, j in zip(one.tolist(), other.tolist(), strict=True)]),
        )


@dataclass(frozen=True)
class Loops:
    """Loops of differences, and lines between known marks; arrays have one entry for each.

    `marks` as walked; `misclosure` (loops, components) and its `covariance`; `length` metres; `rows` the observations.
    """

    marks: Ragged
    misclosure: FloatArray
    covariance: FloatArray
    length: FloatArray
    rows: Ragged

    @property
    def closed(self) -> BoolArray:
        """Loops (loops,) that come back to the mark they began at, rather than running between two known ones."""
        closed: BoolArray = self.marks.values[self.marks.starts[:-1]] == self.marks.values[self.marks.starts[1:] - 1]
        return closed


def loops_of(edges: Differences, marks: int, known: FloatArray, known_variance: FloatArray) -> Loops:
    """A basis of short loops, all marks with known values counting as one place.

    `known` (marks, components) is NaN where nothing is known; `known_variance` has its shape. What a line between two
    known marks misses by is how far it arrives from the second when it sets out from the first.
    """
    ground = marks
    held = np.asarray(np.isfinite(known).all(axis=1))
    nodes = np.where(np.take(held, edges.marks), ground, edges.marks)
    cycles = short_cycles(nodes, walking_lengths(edges.length), marks + 1, ground)
    steps = cycles.edges
    walked = walked_marks(cycles, edges.marks)
    sign = cycles.sign[:, None]
    misclosure = steps.total(sign * edges.value[steps.values])
    start, end = walked.values[walked.starts[:-1]], walked.values[walked.starts[1:] - 1]
    line = (start != end)[:, None]
    misclosure += np.where(line, np.nan_to_num(known)[start] - np.nan_to_num(known)[end], 0.0)
    covariance = steps.total(edges.covariance[steps.values])
    covariance += np.where(line[:, None], _diagonal(known_variance[start] + known_variance[end]), 0.0)
    rows = edges.rows.take(steps.values)
    return Loops(
        walked,
        misclosure,
        covariance,
        steps.total(edges.length[steps.values]),
        Ragged(rows.values, rows.starts[steps.starts]),
    )


def walked_marks(cycles: Cycles, marks: IntArray) -> Ragged:
    """The marks of each walk, the last included, from the `marks` (edges, 2) at the ends of its edges."""
    ends = marks[cycles.edges.values]
    backwards = cycles.sign < 0
    start, end = np.where(backwards, ends[:, 1], ends[:, 0]), np.where(backwards, ends[:, 0], ends[:, 1])
    last = cycles.edges.starts[1:] - 1
    values = np.insert(start, cycles.edges.starts[1:], end[last])
    return Ragged(values, cycles.edges.starts + np.arange(len(cycles) + 1))


def walking_lengths(length: FloatArray) -> FloatArray:
    """Lengths (edges,) with the median in place of unknown ones; all 1 where none is known."""
    known = length[np.isfinite(length)]
    return np.where(np.isfinite(length), length, np.median(known) if len(known) else 1.0)


def _diagonal(variance: FloatArray) -> FloatArray:
    return variance[:, :, None] * np.eye(variance.shape[1])
