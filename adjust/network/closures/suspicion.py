"""What to look at first: observations that failing closures have in common and passing ones do without."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.network.closures.closures import Judged
from adjust.network.closures.ragged import Ragged, joined

MOST_SUSPICIONS = 10
"""Named at most: whoever has more failing closures than that mends these first and checks again."""
MOST_ROWS = 8
"""Rows that one suspicion names at most; more of them say no more than the closure itself does."""
LINE_CHECKS = frozenset(
    ("level_loop", "level_line", "height_loop", "vector_loop", "vector_line", "triangle", "quadrilateral", "angle_sum")
) | {"traverse_loop", "traverse_link"}
"""Checks whose closures are made of lines from mark to mark."""


@dataclass(frozen=True)
class Suspicion:
    """Rows that nothing tells apart: the numbers of failing and of passing closures that rest on each of them."""

    rows: tuple[int, ...]
    failing: int
    passing: int


@dataclass(frozen=True)
class SharedLine:
    """Two failing closures, `first` and `second` by check and place, that share the line `marks` and no other."""

    check: str
    first: int
    second: int
    marks: tuple[int, int]
    rows: tuple[int, ...]


def suspicions(checks: Sequence[Judged], rows: int) -> list[Suspicion]:
    """The fewest rows that could explain all failing closures, the likeliest first; `rows` is the number of all rows.

    Taken one after the other: the row that most failing closures not yet explained rest on, each passing closure that
    rests on it counting against it. Rows that the same closures rest on are named together.
    """
    incidence = joined([judged.closures.rows for judged in checks])
    failing: BoolArray = np.concatenate([np.zeros(0, dtype=bool), *(judged.exceeds for judged in checks)])
    unexplained, found = failing.copy(), list[Suspicion]()
    passing = _count(incidence, ~failing, rows)
    every = _count(incidence, failing, rows)
    by_row = _by_row(incidence, rows)
    while unexplained.any() and len(found) < MOST_SUSPICIONS:
        explained = _count(incidence, unexplained, rows)
        score = np.where(explained > 0, explained - passing, -np.inf)
        best = np.flatnonzero(score == score.max())
        if not len(best) or not np.isfinite(score.max()):
            break
        first = by_row[int(best[0])]
        alike = [int(row) for row in best if np.array_equal(by_row[int(row)], first)]
        found.append(Suspicion(tuple(alike[:MOST_ROWS]), int(every[alike[0]]), int(passing[alike[0]])))
        unexplained[first] = False
    return found


def _count(incidence: Ragged, chosen: BoolArray, rows: int) -> FloatArray:
    """In how many of the chosen closures each row is."""
    return np.bincount(incidence.values[chosen[incidence.owner]], minlength=rows).astype(np.float64)


def _by_row(incidence: Ragged, rows: int) -> Ragged:
    """The closures that each row is in."""
    places = Ragged.grouped(incidence.values, rows)
    return Ragged(incidence.owner[places.values], places.starts)


def shared_lines(checks: Sequence[Judged]) -> list[SharedLine]:
    """Pairs of failing closures of one check with exactly one line in common, in their order."""
    found: list[SharedLine] = []
    for judged in checks:
        if judged.closures.check in LINE_CHECKS:
            found += _shared(judged)
    return found


def _shared(judged: Judged) -> list[SharedLine]:
    closures = judged.closures
    failing: list[int] = np.flatnonzero(judged.exceeds).tolist()
    with_line: dict[tuple[int, int], list[int]] = {}
    for number in failing:
        for line in _lines(closures.marks[number]):
            with_line.setdefault(line, []).append(number)
    shared = Counter(
        (one, other) for numbers in with_line.values() if len(numbers) == 2 for one, other in [(numbers[0], numbers[1])]
    )
    single = [
        (numbers[0], numbers[1], line)
        for line, numbers in with_line.items()
        if len(numbers) == 2 and shared[numbers[0], numbers[1]] == 1
    ]
    return [
        SharedLine(closures.check, one, other, line, _common(closures.rows[one], closures.rows[other]))
        for one, other, line in sorted(single)
    ]


def _lines(marks: IntArray) -> list[tuple[int, int]]:
    return list(dict.fromkeys((min(step), max(step)) for step in pairwise(marks.tolist())))


def _common(one: IntArray, other: IntArray) -> tuple[int, ...]:
    return tuple(np.intersect1d(one, other).tolist())
