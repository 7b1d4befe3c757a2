"""Linear misclosures of traverses, once their angular misclosure is shared out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import PlaneFrame
from adjust.network.closures.closures import Closures
from adjust.network.closures.compass_rule import compass_rule, legs
from adjust.network.closures.course import Course, Courses
from adjust.network.closures.lines import Lines
from adjust.network.closures.observed import Observed
from adjust.network.closures.orientation import Orientations
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.traverses import Step, find_legs, find_walks
from adjust.observations.direction import azimuth_of
from adjust.tolerances import Quantity

QUARTER_TURN = np.array([[0.0, -1.0], [1.0, 0.0]])
"""Turns rows east, north clockwise by a right angle."""


@dataclass(frozen=True)
class Traverse:
    """A traverse computed; metres.

    `marks` as walked; `steps` (legs, 2) east and north along its azimuths, with the angular misclosure (`angular`,
    radians, with its sd) shared out, or `unbalanced`; `arrival` (2,) is what they ought to sum to. `misclosure` (2,)
    is their sum minus that. `leg_rows` are the observations of each leg's length, `corner_rows` those of the angle at
    the start of a leg (the last corner at the end). `positions` (legs − 1, 2 or 3) are the frame's coordinates of the
    marks on the way by the compass rule, where the traverse sets out from control; None elsewhere.
    """

    marks: list[int]
    steps: FloatArray
    unbalanced: FloatArray
    arrival: FloatArray
    length: float
    angular: float
    angular_sd: float
    sd: float
    leg_rows: list[list[int]]
    corner_rows: dict[int, list[int]]
    oriented: bool
    positions: FloatArray | None

    @property
    def rows(self) -> list[int]:
        """All observations that it rests on."""
        return [row for rows in (*self.leg_rows, *self.corner_rows.values()) for row in rows]

    @property
    def misclosure(self) -> FloatArray:
        """East and north (2,), metres."""
        closing: FloatArray = self.steps.sum(axis=0) - self.arrival
        return closing

    @property
    def from_control(self) -> bool:
        """Whether it sets out from a mark of control."""
        return self.positions is not None


class Traversing:
    """Computes the traverses of a job."""

    def __init__(self, observed: Observed, orientations: Orientations, lines: Lines) -> None:
        self.observed, self.orientations, self.lines = observed, orientations, lines
        self.geometry = observed.geometry
        self.length = lines.lengths.length
        self.variance = lines.lengths.covariance[:, 0, 0]
        self.curved = not isinstance(self.geometry.frame, PlaneFrame)
        sights = orientations.stations.readings.sights
        self.azimuth = azimuth_of(self.geometry.sight(*sights.T, plumb=True).enu)
        self.apart = self.geometry.level_distance(*lines.lengths.marks.T)[0]

    def traverses(self) -> list[Traverse]:
        """Every traverse that can be computed, in the order of a basis of short ones."""
        found, places = find_legs(self.observed, self.orientations, self.lines)
        walks = find_walks(found, places, self.length, self.orientations.stations.groups)
        courses = Courses(self.orientations)
        computed = (self._computed(courses.course(walk)) for walk in walks)
        return [traverse for traverse in computed if traverse is not None]

    def _computed(self, course: Course | None) -> Traverse | None:
        if course is None or len(course.legs) < 2:
            return None
        line = np.array([leg.line for leg in course.legs])
        marks = [course.legs[0].start, *(leg.end for leg in course.legs)]
        length = self.length[line]
        reference = self._reference(course, marks, line)
        if not np.isfinite(reference).all():
            return None
        arrival: FloatArray = reference.sum(axis=0)
        steps, unbalanced = legs(course.balanced, length), legs(course.azimuth, length)
        if not course.oriented:
            turn = self._turn(course, marks, unbalanced, reference)
            steps, unbalanced = _turned(steps, turn), _turned(unbalanced, turn)
        along = arrival if marks[0] != marks[-1] and not course.oriented else None
        leg_rows = [self.lines.lengths.rows[place].tolist() for place in line.tolist()]
        corner_rows = self._corner_rows(course)
        angles = np.array([np.sum(self.observed.sd[rows] ** 2) for rows in corner_rows])
        sd = self._precision(course, angles, line, unbalanced, along)
        positions = self._positions(marks, steps, reference, length) if self._controlled(marks) else None
        return Traverse(
            marks,
            steps,
            unbalanced,
            arrival,
            float(length.sum()),
            course.angular,
            float(np.sqrt(angles.sum())),
            sd,
            leg_rows,
            {corner.first: rows for corner, rows in zip(course.corners, corner_rows, strict=True)},
            course.oriented,
            positions,
        )

    def _controlled(self, marks: list[int]) -> bool:
        held = self.observed.held[:, 0]
        return bool(held[marks[0]] and held[marks[-1]])

    def _reference(self, course: Course, marks: list[int], line: IntArray) -> FloatArray:
        """What the legs (legs, 2) ought to be: between coordinates on the ellipsoid, where axes turn from mark to mark;
        in a plane anything with the right sum, so that no coordinates are needed on the way."""
        if self.curved:
            return legs(np.array([self._predicted(leg) for leg in course.legs]), self.apart[line])
        given = self.geometry.coordinates[:, :2]
        arrival = given[marks[-1]] - given[marks[0]] if marks[-1] != marks[0] else np.zeros(2)
        share: FloatArray = self.length[line] / self.length[line].sum()
        return share[:, None] * arrival

    def _predicted(self, leg: Step) -> float:
        """Azimuth of a leg between coordinates, in the axes of the station that sights along it."""
        return float(self.azimuth[leg.leaving] if leg.leaving >= 0 else self.azimuth[leg.entering] + np.pi)

    def _turn(self, course: Course, marks: list[int], steps: FloatArray, reference: FloatArray) -> float:
        """How far to turn a traverse that no known direction orients: to where it has to arrive, else to its first
        leg."""
        if marks[0] != marks[-1]:
            return _azimuth(reference.sum(axis=0)) - _azimuth(steps.sum(axis=0))
        turn = self._predicted(course.legs[0]) - float(course.azimuth[0])
        return turn if np.isfinite(turn) else 0.0

    def _corner_rows(self, course: Course) -> list[list[int]]:
        """The observations of each corner's angle."""
        stations = self.orientations.stations
        ways = [stations.way(corner.one, corner.other) for corner in course.corners]
        return [stations.readings.rows[way].tolist() for way in ways]

    def _precision(
        self, course: Course, angles: FloatArray, line: IntArray, steps: FloatArray, along: FloatArray | None
    ) -> float:
        """The sd of a traverse's linear misclosure, metres, from the variances of its corners' `angles` (corners,).

        Each length moves the end along its leg, each angle across the line from its mark to the end; where the angular
        misclosure is shared out, an angle's error moves the end by its own lever less the mean of all levers. A
        traverse that nothing orients shows only what the end is off by `along` (2,) the line to it.
        """
        at = np.vstack([np.zeros(2), np.cumsum(steps, axis=0)])
        levers = np.array([at[corner.last] - at[corner.first] for corner in course.corners]).reshape(-1, 2)
        if course.share.any():
            levers = levers - levers.mean(axis=0)
        moves = np.vstack([steps / np.hypot(*steps.T)[:, None], levers @ QUARTER_TURN])
        if along is not None:
            moves = moves @ (along / np.hypot(*along))[:, None]
        variances = np.concatenate([self.variance[line], angles])
        return float(np.sqrt(variances @ np.sum(moves**2, axis=1)))

    def _positions(self, marks: list[int], steps: FloatArray, reference: FloatArray, length: FloatArray) -> FloatArray:
        """Coordinates (legs − 1, 3) by the compass rule of the marks on the way; the heights are not the traverse's."""
        balanced = compass_rule(steps, length, reference.sum(axis=0))
        on_the_way = marks[1:-1]
        if not self.curved:
            plan = self.geometry.coordinates[marks[0], :2] + np.cumsum(balanced.steps, axis=0)[:-1]
            return np.column_stack([plan, np.full(len(plan), np.nan)])
        shift = np.cumsum(balanced.steps - reference, axis=0)[:-1]
        moved = np.column_stack([shift, np.zeros(len(shift))])
        return self.geometry.frame.moved(self.geometry.coordinates[on_the_way], moved)


def traverse_closures(traverses: list[Traverse]) -> list[Closures]:
    """Linear misclosures of closed traverses, and of those from one mark of control to another.

    `precision` is N of 1 : N, `east` and `north` the misclosure's parts (towards an arbitrary north where nothing
    orients the traverse), `angular` what was shared out before.
    """
    closed = [traverse.marks[0] == traverse.marks[-1] for traverse in traverses]
    loops = [traverse for traverse, back in zip(traverses, closed, strict=True) if back]
    links = [traverse for traverse, back in zip(traverses, closed, strict=True) if not back]
    return [_closures("traverse_loop", loops), _closures("traverse_link", links)]


def _closures(check: str, traverses: list[Traverse]) -> Closures:
    parts = np.array([traverse.misclosure for traverse in traverses]).reshape(-1, 2)
    linear = np.hypot(*parts.T)
    length = np.array([traverse.length for traverse in traverses])
    with np.errstate(divide="ignore"):
        precision = length / linear
    return Closures(
        check,
        "m",
        linear[:, None],
        np.array([traverse.sd for traverse in traverses])[:, None],
        Ragged.of([traverse.marks for traverse in traverses]),
        Ragged.of([traverse.rows for traverse in traverses]),
        length,
        np.array([len(traverse.marks) - 1 for traverse in traverses], dtype=np.int64),
        Quantity.POSITION,
        figures={
            "east": parts[:, 0],
            "north": parts[:, 1],
            "precision": precision,
            "angular": np.array([traverse.angular for traverse in traverses]),
        },
    )


def _azimuth(step: FloatArray) -> float:
    return float(np.arctan2(step[0], step[1]))


def _turned(steps: FloatArray, angle: float) -> FloatArray:
    """Steps (legs, 2) turned clockwise."""
    sine, cosine = np.sin(angle), np.cos(angle)
    return np.column_stack([steps[:, 0] * cosine + steps[:, 1] * sine, steps[:, 1] * cosine - steps[:, 0] * sine])
