"""One point from everything that bears on it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from statistics import median

from adjust.network.constructions.loci import Locus, meetings
from adjust.network.constructions.resection import ahead, resect

MOST_LOCI = 5
"""Loci that are crossed pair by pair: ten pairs, among which a single gross error is in the minority. The rest only say
how well each point fits."""

PASSABLE = 0.1
"""A point that misses one of its own two loci by more (six degrees, or a tenth of a distance) lies on the wrong end of
a ray or on the other arc."""

OUTVOTING = 5
"""Loci among which one gross error is outvoted: two fix a point, two of the other three contradict a wrong one."""

DECISIVE = 5.0
"""How many times worse the rejected one of two intersections must fit the remaining observations. Raw slope distances
and rough given coordinates spoil both fits alike; they hardly change their order five times over."""

NOTICEABLE = 1e-3
"""Sum of misfits under which even the worse of two intersections is not refuted: three minutes of arc, more than field
observations and reductions leave, less than a third mark off the line of the first two makes."""


@dataclass(frozen=True)
class Pencil:
    """The directions from a mark, not oriented, to targets with known points."""

    readings: tuple[float, ...]
    targets: tuple[complex, ...]


@dataclass(frozen=True)
class Finding:
    """The points that are left: none, the one, or two between which nothing decides."""

    points: tuple[complex, ...]
    on_danger_circle: bool = False


@dataclass(frozen=True)
class _Candidate:
    point: complex
    misfit: float
    rival: complex | None = None
    """The other intersection of the same two loci, unless it is refuted."""


def consensus(points: Sequence[complex]) -> complex:
    """The median of both coordinates."""
    if len(points) < 2:
        return points[0]
    return complex(median(point.real for point in points), median(point.imag for point in points))


def find_point(loci: Sequence[Locus], pencils: Sequence[Pencil]) -> Finding:
    """The point that the loci and resections agree on best."""
    candidates, endangered = _resections(loci, pencils)
    for one, other in combinations(loci[:MOST_LOCI], 2):
        candidates += _crossings(one, other, loci)
    if not candidates:
        return Finding((), endangered)
    best = min(candidates, key=lambda candidate: candidate.misfit)
    return Finding((best.point,) if best.rival is None else (best.point, best.rival))


def misfit(point: complex, loci: Sequence[Locus]) -> float:
    """Sum of the misfits of a point; where there are enough loci to outvote one, without the worst."""
    misfits = [min(locus.misfit(point), 1.0) for locus in loci]
    return sum(misfits) - (max(misfits) if len(misfits) >= OUTVOTING else 0.0)


def refutes(worse: float, better: float) -> bool:
    """Whether a sum of misfits is too much worse than another one for its point to be the right one."""
    return worse > NOTICEABLE and worse > DECISIVE * better


def _resections(loci: Sequence[Locus], pencils: Sequence[Pencil]) -> tuple[list[_Candidate], bool]:
    candidates, endangered = [], False
    for pencil in pencils:
        if len(pencil.targets) < 3:
            continue
        resected = resect(pencil.readings, pencil.targets)
        endangered |= resected.on_danger_circle
        station = resected.station
        if station is not None and ahead(pencil.readings, pencil.targets, station):
            candidates.append(_Candidate(station, misfit(station, loci)))
    return candidates, endangered


def _crossings(one: Locus, other: Locus, loci: Sequence[Locus]) -> list[_Candidate]:
    """The better intersection of two loci, with the other one if that is not refuted."""
    points = [p for p in meetings(one, other) if max(one.misfit(p), other.misfit(p)) < PASSABLE]
    ranked = sorted(((misfit(point, loci), place) for place, point in enumerate(points)))
    if not ranked:
        return []
    least, place = ranked[0]
    if len(ranked) == 1 or refutes(ranked[1][0], least):
        return [_Candidate(points[place], least)]
    return [_Candidate(points[place], least, points[ranked[1][1]])]
