"""What to look at first: observations that failing closures have in common and passing ones do without."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.network.closures.closures import Judged
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged, joined

MOST_SUSPICIONS = 10
"""Named at most: whoever has more failing closures than that mends these first and checks again."""
SECOND_THOUGHT = 1e-3
"""What a failing closure that is explained already counts against a row: it decides between equals, nothing else."""
LINE_CHECKS = frozenset(
    ("level_loop", "level_line", "height_loop", "vector_loop", "vector_line", "triangle", "quadrilateral", "angle_sum")
) | {"traverse_loop", "traverse_link"}
"""Checks whose closures are made of lines from mark to mark."""
KNOWN_DIRECTIONS = frozenset(("azimuth_link", "orientation"))
"""Checks that set out from a direction between two marks of control."""
CONTROL_CHECKS = KNOWN_DIRECTIONS | {"level_line", "height_loop", "traverse_link", "vector_line", "control_distance"}
"""Checks whose closures rest on given coordinates at their ends."""


@dataclass(frozen=True)
class Suspicion:
    """Rows, and marks of control, that nothing tells apart: how many failing and passing closures rest on each."""

    rows: tuple[int, ...]
    marks: tuple[int, ...]
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


def suspicions(checks: Sequence[Judged], observed: Observed) -> list[Suspicion]:
    """The fewest rows and marks of control that could explain all failing closures, the likeliest first.

    Taken one after the other: what most failing closures not yet explained rest on, each passing closure that rests on
    it counting against it. What the same closures rest on is named together.
    """
    if not any(judged.exceeds.any() for judged in checks):
        return []
    rows, size = len(observed), len(observed) + len(observed.job.marks)
    incidence = joined([_rests_on(judged, observed) for judged in checks])
    failing: BoolArray = np.concatenate([np.zeros(0, dtype=bool), *(judged.exceeds for judged in checks)])
    every, passing = _count(incidence, failing, size), _count(incidence, ~failing, size)
    closures_of = _by_value(incidence, size)
    unexplained, found = failing.copy(), list[Suspicion]()
    while unexplained.any() and len(found) < MOST_SUSPICIONS:
        explained = _count(incidence, unexplained, size)
        again = SECOND_THOUGHT * (every - explained)
        score = np.where(explained > 0, explained - passing - again, -np.inf)
        best = int(np.argmax(score))
        if not explained[best]:
            break
        alike = [int(other) for other in np.flatnonzero(score == score[best]) if _same(closures_of, best, int(other))]
        found.append(
            Suspicion(
                tuple(number for number in alike if number < rows),
                tuple(number - rows for number in alike if number >= rows),
                int(every[best]),
                int(passing[best]),
            )
        )
        unexplained[closures_of[best]] = False
    return found


def _same(closures_of: Ragged, one: int, other: int) -> bool:
    return np.array_equal(closures_of[one], closures_of[other])


def _rests_on(judged: Judged, observed: Observed) -> Ragged:
    """The observations of each closure, and behind all rows the marks of control that it sets out from or arrives
    at."""
    closures = judged.closures
    lists = [closures.rows[number].tolist() for number in range(len(closures))]
    if closures.check in CONTROL_CHECKS:
        for number, numbers in enumerate(lists):
            marks = closures.marks[number].tolist()
            ends = {*marks[:2], *marks[-2:]} if closures.check in KNOWN_DIRECTIONS else {marks[0], marks[-1]}
            if marks[0] != marks[-1] or closures.check in KNOWN_DIRECTIONS:
                numbers += [len(observed) + mark for mark in sorted(ends) if observed.held[mark].any()]
    return Ragged.of(lists)


def _count(incidence: Ragged, chosen: BoolArray, size: int) -> FloatArray:
    """How many of the chosen closures rest on each number."""
    return np.bincount(incidence.values[chosen[incidence.owner]], minlength=size).astype(np.float64)


def _by_value(incidence: Ragged, size: int) -> Ragged:
    """The closures that rest on each number."""
    places = Ragged.grouped(incidence.values, size)
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
