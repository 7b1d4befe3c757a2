"""The level book: rises of sections between marks, side shots, and the checks a level book carries.

Rows are staff positions in the order walked. A backsight opens a setup of the level, a foresight closes it; a turning
point or a mark on the way has both, the foresight of the setup behind and the backsight of the one ahead.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.observations.base import Columns
from adjust.reductions.circle import group_sums

TURNING_POINT = -1
"""In place of a mark."""


@dataclass(frozen=True)
class StaffRows(Columns):
    """Staff positions; arrays (rows,), metres, NaN where nothing was read.

    `line` numbers the runs, each in one piece; `mark` the marks, `TURNING_POINT` elsewhere. `backsight_distance` and
    `foresight_distance` are the lengths of the sights; the foresight's stands for that of an intermediate sight too.
    `collimation` is the rise of the line of sight, radians, 0 where it is not known.
    """

    line: IntArray
    mark: IntArray
    backsight: FloatArray
    intermediate: FloatArray
    foresight: FloatArray
    backsight_distance: FloatArray
    foresight_distance: FloatArray
    collimation: FloatArray

    def __len__(self) -> int:
        return len(self.line)


@dataclass(frozen=True)
class Sections(Columns):
    """Levelled from mark to mark; arrays (sections,).

    `start` and `end` are rows of the book. `rise` is end minus start, metres, corrected by `correction`; `length` the
    sum of the sights, `imbalance` backsights minus foresights, metres, NaN where a sight has no length; `setups`
    counts. `side` marks intermediate sights.
    """

    start: IntArray
    end: IntArray
    rise: FloatArray
    correction: FloatArray
    length: FloatArray
    imbalance: FloatArray
    setups: IntArray
    side: BoolArray


@dataclass(frozen=True)
class ArithmeticCheck(Columns):
    """Sums over each line (lines,), metres: ΣB, ΣF, and the sum of the uncorrected rises of its sections."""

    backsights: FloatArray
    foresights: FloatArray
    rises: FloatArray

    @property
    def difference(self) -> FloatArray:
        """ΣB − ΣF − Σ rises: 0 but for rounding when the book was reduced without a slip."""
        return self.backsights - self.foresights - self.rises


def reduce_levels(book: StaffRows) -> Sections:
    """Sections and side shots of a book without faults (`faults_of`), in the order of their last rows.

    Height of a staff = height of the last backsight's staff + backsight − reading. A side shot starts at the last mark
    that was passed. A line of sight that rises by c reads c · distance too much, so that the rise of a setup is too
    large by c · (backsight length − foresight length). Schofield & Breach (2007), *Engineering Surveying*, 6th edition,
    chapter 3 (from memory).
    """
    run = _Run.of(book)
    start, end = run.start, run.end
    correction = run.between(-book.collimation * book.backsight_distance, book.collimation * book.foresight_distance)
    behind = run.between(book.backsight_distance, np.zeros(len(book)))
    ahead = run.between(np.zeros(len(book)), book.foresight_distance)
    rise = run.between(book.backsight, -run.forward)
    setups = run.between(np.zeros(len(book)), np.ones(len(book)))
    known = np.nan_to_num(correction)
    return Sections(
        start, end, rise + known, known, behind + ahead, behind - ahead, np.rint(setups).astype(np.int64), run.side[end]
    )


@dataclass(frozen=True)
class _Run:
    """A book as it is walked: which reading looks `forward` (rows,), which rows are `side` shots, and the rows at which
    sections `start` and `end`."""

    opened: BoolArray
    forward: FloatArray
    side: BoolArray
    start: IntArray
    end: IntArray

    @classmethod
    def of(cls, book: StaffRows) -> _Run:
        side = ~np.isnan(book.intermediate)
        forward = np.where(side, book.intermediate, book.foresight)
        passed = book.mark != TURNING_POINT
        last = np.maximum.accumulate(np.where(passed & ~side, np.arange(len(book)), 0))
        end = np.flatnonzero(passed & ~np.isnan(forward))
        return cls(~np.isnan(book.backsight), forward, side, last[end - 1], end)

    def between(self, at_backsights: FloatArray, at_foresights: FloatArray) -> FloatArray:
        """Sums over each section (sections,) of what its back- and foresights contribute; NaN where one is missing."""
        behind = np.where(self.opened, at_backsights, 0.0)
        ahead = np.where(np.isnan(self.forward), 0.0, at_foresights)
        total = self._difference(np.nan_to_num(behind), np.nan_to_num(ahead))
        missing = self._difference(np.isnan(behind).astype(float), np.isnan(ahead).astype(float))
        return np.where(missing == 0, total, np.nan)

    def _difference(self, behind: FloatArray, ahead: FloatArray) -> FloatArray:
        """Of running sums with all backsights before a row and all foresights up to it; a side shot counts only for
        itself."""
        own = np.where(self.side, ahead, 0.0)
        running = np.cumsum(behind) - behind + np.cumsum(ahead - own) + own
        return running[self.end] - running[self.start]


def arithmetic_check(book: StaffRows, sections: Sections, lines: int) -> ArithmeticCheck:
    """ΣB − ΣF of each line beside the rises of its sections, side shots left out. Source as `reduce_levels`."""
    backsights, foresights = (
        group_sums(np.nan_to_num(column), book.line, lines) for column in (book.backsight, book.foresight)
    )
    straight = sections.take(~sections.side)
    rises = group_sums(straight.rise - straight.correction, book.line[straight.end], lines)
    return ArithmeticCheck(backsights, foresights, rises)


def faults_of(book: StaffRows) -> list[tuple[int, str]]:
    """Rows that no level can have observed, each with what is wrong, in words; empty for a sound book."""
    opened, closed, side = (~np.isnan(column) for column in (book.backsight, book.foresight, book.intermediate))
    first = np.diff(book.line, prepend=-1) != 0
    last = np.diff(book.line, append=-1) != 0
    start = np.maximum.accumulate(np.where(first, np.arange(len(book)), 0))
    balance = np.cumsum(opened) - opened - (np.cumsum(closed) - closed)
    is_open = balance - balance[start] == 1
    turning = book.mark == TURNING_POINT
    checks = (
        (~(opened | closed | side), "the row has no staff reading; give it one, or take the row out"),
        (
            side & (opened | closed),
            "an intermediate sight stands in a row of its own, expected no other reading beside it",
        ),
        (first & (closed | side), "a line starts with a backsight alone; look for a missing first row"),
        (last & (opened | side), "a line ends with a foresight alone; look for a missing last row"),
        (first & turning, "a line starts on a mark, expected its name in 'point'"),
        (last & turning, "a line ends on a mark, expected its name in 'point'"),
        (side & turning, "an intermediate sight to no mark leads nowhere; name the mark"),
        (~first & (closed | side) & ~is_open, "no backsight stands before this reading; look for a missing backsight"),
        (
            ~first & opened & ~closed,
            "a new backsight without a foresight to the same point; look for a missing foresight",
        ),
    )
    faults = {int(row): message for where, message in reversed(checks) for row in np.flatnonzero(where)}
    return sorted(faults.items())
