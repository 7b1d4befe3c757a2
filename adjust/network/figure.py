"""A figure: marks with points and rounds with orientations in one system of axes, grown mark by mark."""

from __future__ import annotations

import cmath
import math
from collections import OrderedDict, deque
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from itertools import pairwise
from statistics import median

from adjust.network.constructions.loci import Locus
from adjust.network.constructions.point import find_point, misfit, refutes
from adjust.network.constructions.similarity import Similarity
from adjust.network.evidence import free_station_point, loci_of, pencils_of, polar_point
from adjust.network.survey import Survey

TO_NORTH = 0.0
"""Orientation of a round whose circle counts from north, once the figure's axes do."""


class Worklist:
    """Marks waiting for their turn, each once, first come first served."""

    def __init__(self) -> None:
        self._marks: OrderedDict[int, None] = OrderedDict()

    def __bool__(self) -> bool:
        return bool(self._marks)

    def add(self, mark: int) -> None:
        """Wait, unless it waits already."""
        self._marks[mark] = None

    def clear(self) -> None:
        """Nobody waits."""
        self._marks.clear()

    def next(self) -> int:
        """The one that has waited longest."""
        return self._marks.popitem(last=False)[0]


class Figure:
    """A part of the network laid out in axes of its own, or in those of the working plane.

    `scaled`: its unit is the metre. `northed`: its north is the working plane's. `handed`: it is no mirror image; only
    a figure made of distances alone can be one, and its rounds stay unused until one of them tells. `rivals` holds the
    marks that have two points left and nothing to choose between them, `endangered` those seen on a danger circle.
    """

    def __init__(self, survey: Survey, *, scaled: bool = False, handed: bool = True) -> None:
        self.survey = survey
        self.scaled, self.northed, self.handed = scaled, False, handed
        self.points: dict[int, complex] = {}
        self.orientations: dict[int, float] = {}
        self.rivals: dict[int, tuple[complex, ...]] = {}
        self.endangered: set[int] = set()
        self.hints: dict[int, list[Locus]] = {}
        self.strain = 0.0
        self._on_trial = False
        self._first_try, self._second_try = Worklist(), Worklist()
        self._turned: deque[int] = deque()

    def place(self, mark: int, point: complex) -> None:
        """Give a mark its point, and look again at everything around it."""
        if self._on_trial:
            self.strain = max(self.strain, misfit(point, loci_of(self, mark)))
        self.rivals.pop(mark, None)
        self.points[mark] = point
        self.settle(mark)

    def place_all(self, points: Iterable[tuple[int, complex]]) -> None:
        """Give many marks their points before any of them is used."""
        new = {mark: point for mark, point in points if mark not in self.points}
        self.points.update(new)
        for mark in new:
            self.rivals.pop(mark, None)
            self.settle(mark)

    def absorb(self, other: Figure) -> None:
        """Take over the points and orientations of a figure that lies in the same axes; it is used up.

        Where only the other one knows the north, both turn to it.
        """
        if other.northed and not self.northed:
            to_north = Similarity(cmath.rect(1.0, -other.orientations[self.survey.north[0]]), 0j)
            self.transform(to_north)
            other.transform(to_north)
        self.points |= {mark: point for mark, point in other.points.items() if mark not in self.points}
        if other.northed and not self.northed:
            self.find_north()
        for number, orientation in other.orientations.items():
            self.orient(number, orientation)
        for mark in other.points:
            self.rivals.pop(mark, None)
            self.settle(mark)

    def orient(self, number: int, orientation: float) -> None:
        """Give a round its orientation: the azimuth of its circle's zero in the figure's axes."""
        if number in self.orientations or not self.handed:
            return
        if self.survey.northed[number] and not self.northed:
            if self._on_trial:
                return
            self.transform(Similarity(cmath.rect(1.0, -orientation), 0j))
            self.find_north()
            return
        self.orientations[number] = orientation
        self._turned.append(number)

    def find_north(self) -> None:
        """The figure's axes are those of the working plane: every round that counts from north is oriented."""
        self.northed = True
        for number in self.survey.north:
            self.orient(number, TO_NORTH)

    def grow(self, most: int | None = None) -> None:
        """Place every mark that follows: by polar points and free stations first, else by intersections.

        No more than `most` marks, if that is given.
        """
        full = None if most is None else len(self.points) + most
        while full is None or len(self.points) < full:
            if self._turned:
                self._follow_orientation(self._turned.popleft())
            elif self._first_try:
                self._place_by_distance(self._first_try.next())
            elif self._second_try:
                self._place_by_crossing(self._second_try.next())
            else:
                return

    def settle(self, mark: int) -> None:
        """Orient the rounds on a placed mark and those that see it, and call up its neighbours."""
        survey = self.survey
        if not self.handed and not self._on_trial:
            self._find_hand(mark)
        for number in (*survey.rounds[mark], *survey.seen_by[mark]):
            if survey.station[number] in self.points:
                self._orient_by_points(number)
        if not self.scaled and not self._on_trial:
            self._find_scale(mark)
        for neighbour in survey.neighbours(mark):
            self.call_up(neighbour)

    def call_up(self, mark: int) -> None:
        """Try, or try again, to place a mark."""
        if mark not in self.points:
            self._first_try.add(mark)

    def transform(self, similarity: Similarity) -> None:
        """Move all points, turn all orientations."""
        self.points = {mark: similarity(point) for mark, point in self.points.items()}
        turn = cmath.phase(similarity.turn)
        sign = -1.0 if similarity.mirrored else 1.0
        self.orientations = {number: sign * value + turn for number, value in self.orientations.items()}
        self.rivals.clear()

    @contextmanager
    def trial(self) -> Iterator[None]:
        """Whatever is placed inside is taken back at the end; `strain` is the worst that observations object to it."""
        outer, self._on_trial = self._on_trial, True
        strain, self.strain = self.strain, self.strain if outer else 0.0
        points, orientations, rivals = len(self.points), len(self.orientations), dict(self.rivals)
        yield
        for entries, count in ((self.points, points), (self.orientations, orientations)):
            while len(entries) > count:
                entries.popitem()
        self.rivals, self.strain, self._on_trial = rivals, strain, outer
        for waiting in (self._turned, self._first_try, self._second_try):
            waiting.clear()

    def _place_by_distance(self, mark: int) -> None:
        if mark in self.points:
            return
        point = polar_point(self, mark)
        if point is None:
            point = free_station_point(self, mark)
        if point is None:
            self._second_try.add(mark)
        else:
            self.place(mark, point)

    def _place_by_crossing(self, mark: int) -> None:
        if mark in self.points:
            return
        finding = find_point(loci_of(self, mark), pencils_of(self, mark))
        if finding.on_danger_circle:
            self.endangered.add(mark)
        undecided = len(finding.points) > 1
        if undecided and (self.handed or len(self.points) > 2):
            self.rivals[mark] = finding.points
        elif finding.points:
            self.place(mark, finding.points[0])

    def _follow_orientation(self, number: int) -> None:
        """A round is oriented: its rays count, and those who look back along them are oriented too."""
        survey = self.survey
        station = survey.station[number]
        self.call_up(station)
        for target, reading in survey.sights[number].items():
            self.call_up(target)
            for back in survey.rounds[target]:
                if station in survey.sights[back]:
                    # read anew each time: orienting a round that counts from north turns the whole figure
                    forward = self.orientations[number] + reading
                    self.orient(back, forward + math.pi - survey.sights[back][station])

    def _orient_by_points(self, number: int) -> None:
        """Orientation from the placed targets: the median, or the one to the farther of two."""
        if number in self.orientations or not self.handed:
            return
        station, sights = self.points[self.survey.station[number]], self.survey.sights[number]
        turns = []
        for target, reading in sights.items():
            line = self.points.get(target, station) - station
            if line:
                turns.append(line * cmath.rect(1.0, -reading))
        if turns:
            farthest = max(turns, key=abs)
            differences = [cmath.phase(turn / farthest) for turn in turns]
            self.orient(number, cmath.phase(farthest) + (median(differences) if len(turns) > 2 else 0.0))

    def _find_scale(self, mark: int) -> None:
        """The first distance with both ends in the figure makes its unit the metre."""
        for other, length in self.survey.distances[mark].items():
            if other in self.points and self.points[other] != self.points[mark]:
                self.transform(Similarity(length / abs(self.points[other] - self.points[mark]) + 0j, 0j))
                self.scaled = True
                for placed in self.points:
                    for neighbour in self.survey.distances[placed]:
                        self.call_up(neighbour)
                return

    def _find_hand(self, mark: int) -> None:
        """The first round that sees two marks off one line tells whether the figure is its own mirror image."""
        survey = self.survey
        for number in (*survey.rounds[mark], *survey.seen_by[mark]):
            upright, mirrored = self._angle_misfits(number)
            if refutes(upright, mirrored) or refutes(mirrored, upright):
                if upright > mirrored:
                    self.transform(Similarity(1.0 + 0j, 0j, mirrored=True))
                self.handed = True
                for placed in list(self.points):
                    self.settle(placed)
                return

    def _angle_misfits(self, number: int) -> tuple[float, float]:
        """How badly the points fit the angles of a round: as they are, and mirrored."""
        survey, points = self.survey, self.points
        station = points.get(survey.station[number])
        placed = [(points[t], reading) for t, reading in survey.sights[number].items() if t in points]
        if station is None or len(placed) < 2:
            return 0.0, 0.0
        upright = mirrored = 0.0
        for (first, back), (second, fore) in pairwise(placed):
            seen = cmath.phase((second - station) * (first - station).conjugate())
            upright += abs(cmath.rect(1.0, seen) - cmath.rect(1.0, fore - back))
            mirrored += abs(cmath.rect(1.0, -seen) - cmath.rect(1.0, fore - back))
        return upright, mirrored
