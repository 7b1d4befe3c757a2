"""Linear misclosures of traverses, once their angular misclosure is shared out; all traverses at once."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import PlaneFrame
from adjust.network.closures.compass_rule import legs
from adjust.network.closures.course import Course, Courses
from adjust.network.closures.lines import Lines
from adjust.network.closures.observed import Observed
from adjust.network.closures.orientation import Orientations
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.traverses import find_legs, find_walks
from adjust.observations.direction import azimuth_of

QUARTER_TURN = np.array([[0.0, -1.0], [1.0, 0.0]])
"""Turns rows east, north clockwise by a right angle."""


@dataclass(frozen=True)
class Legs:
    """The legs of all courses, one after the other: `of` lists the legs of each course.

    Arrays (legs,): `line` is the place in the lines' lengths, `node` the sight that gives the direction, seen from the
    leg's start where `outward`, else from its end.
    """

    of: Ragged
    line: IntArray
    node: IntArray
    outward: BoolArray

    @classmethod
    def of_courses(cls, courses: list[Course]) -> Legs:
        """From courses."""
        every = [leg for course in courses for leg in course.legs]
        counts = [len(course.legs) for course in courses]
        starts = np.concatenate([[0], np.cumsum(counts, dtype=np.int64)]).astype(np.int64)
        leaving = np.array([leg.leaving for leg in every], dtype=np.int64)
        entering = np.array([leg.entering for leg in every], dtype=np.int64)
        line = np.array([leg.line for leg in every], dtype=np.int64)
        return cls(Ragged(np.arange(starts[-1]), starts), line, np.where(leaving >= 0, leaving, entering), leaving >= 0)


@dataclass(frozen=True)
class Corners:
    """The angles that courses rest on: `of` lists those of each course; the others are arrays (corners,).

    `first` and `last` are the legs of all courses between which it turns them; `rows` its observations.
    """

    of: Ragged
    first: IntArray
    last: IntArray
    rows: Ragged

    @classmethod
    def of_courses(cls, courses: list[Course], legs_of: Legs, orientations: Orientations) -> Corners:
        """From courses, with the observations on the way between the two sights of each angle."""
        stations = orientations.stations
        every = [corner for course in courses for corner in course.corners]
        counts = [len(course.corners) for course in courses]
        starts = np.concatenate([[0], np.cumsum(counts, dtype=np.int64)]).astype(np.int64)
        base = np.repeat(legs_of.of.starts[:-1], counts)
        nodes = np.array([(corner.one, corner.other) for corner in every], dtype=np.int64).reshape(-1, 2)
        turned = np.array([(corner.first, corner.last) for corner in every], dtype=np.int64).reshape(-1, 2)
        edges = stations.ways(nodes[:, 0], nodes[:, 1])
        rows = Ragged(stations.readings.rows[edges.values], edges.starts)
        return cls(Ragged(np.arange(starts[-1]), starts), base + turned[:, 0], base + turned[:, 1], rows)


class Traversing:
    """The traverses of a job, as arrays over them all; metres and radians.

    `courses` are those that can be computed: first the closed ones, then those between two marks of control.
    """

    def __init__(self, observed: Observed, orientations: Orientations, lines: Lines) -> None:
        self.observed, self.orientations, self.lines = observed, orientations, lines
        self.geometry = observed.geometry
        self.curved = not isinstance(self.geometry.frame, PlaneFrame)
        sights = orientations.stations.readings.sights
        self._azimuth = azimuth_of(self.geometry.sight(*sights.T, plumb=True).enu)
        self._apart = self.geometry.level_distance(*lines.lengths.marks.T)[0]
        self.courses = self._courses()
        self.legs = Legs.of_courses(self.courses)
        self.corners = Corners.of_courses(self.courses, self.legs, orientations)
        ends = np.array([(course.marks[0], course.marks[-1]) for course in self.courses], dtype=np.int64).reshape(-1, 2)
        self.start, self.end = ends.T
        self.angular = np.array([course.angular for course in self.courses])

    def _courses(self) -> list[Course]:
        found, places = find_legs(self.observed, self.orientations, self.lines)
        walks = find_walks(found, places, self.lines.lengths.length, self.orientations.stations.groups)
        finder = Courses(self.orientations)
        courses = [course for course in map(finder.course, walks) if course is not None and len(course.legs) > 1]
        known = [course for course in courses if self._is_located(course)]
        return sorted(known, key=lambda course: course.marks[0] != course.marks[-1])

    def _is_located(self, course: Course) -> bool:
        """Whether it can be computed: on the ellipsoid, where axes turn from mark to mark, its marks need places."""
        places = self.geometry.coordinates[course.marks, 0]
        return not self.curved or bool(np.isfinite(places).all())

    def __len__(self) -> int:
        return len(self.courses)

    @property
    def closed(self) -> BoolArray:
        """Traverses (traverses,) that end where they began."""
        return np.asarray(self.start == self.end)

    @property
    def from_control(self) -> BoolArray:
        """Traverses (traverses,) that set out from a mark of control and arrive at one."""
        held: BoolArray = self.observed.held[:, 0]
        return held[self.start] & held[self.end]

    @cached_property
    def leg_length(self) -> FloatArray:
        """Horizontal lengths (legs,)."""
        return self.lines.lengths.length[self.legs.line]

    @cached_property
    def length(self) -> FloatArray:
        """Lengths of the traverses (traverses,)."""
        return self.legs.of.total(self.leg_length)

    @cached_property
    def _predicted(self) -> FloatArray:
        """Azimuths (legs,) between coordinates, in the axes of the station that sights along each leg."""
        return self._azimuth[self.legs.node] + np.where(self.legs.outward, 0.0, np.pi)

    @cached_property
    def reference(self) -> FloatArray:
        """What the legs (legs, 2) ought to be: between coordinates on the ellipsoid; in a plane anything with the
        right sum, so that no coordinates are needed on the way."""
        if self.curved:
            return legs(self._predicted, self._apart[self.legs.line])
        given = self.geometry.coordinates[:, :2]
        arrival = np.where(self.closed[:, None], 0.0, given[self.end] - given[self.start])
        owner = self.legs.of.owner
        share: FloatArray = (self.leg_length / self.length[owner])[:, None] * arrival[owner]
        return share

    @cached_property
    def unbalanced(self) -> FloatArray:
        """The legs (legs, 2) east and north by the angles as observed."""
        azimuth = np.concatenate([np.empty(0), *(course.azimuth for course in self.courses)])
        return legs(azimuth + self._turn(azimuth)[self.legs.of.owner], self.leg_length)

    @cached_property
    def steps(self) -> FloatArray:
        """The legs (legs, 2) with the angular misclosure shared out."""
        share = np.concatenate([np.empty(0), *(course.share for course in self.courses)])
        back = -share * self.angular[self.legs.of.owner]
        return _turned(self.unbalanced, back)

    def _turn(self, azimuth: FloatArray) -> FloatArray:
        """How far to turn each traverse (traverses,) that no known direction orients: to where it has to arrive, else
        to the azimuth of its first leg between coordinates, if they are known."""
        of, oriented = self.legs.of, np.array([course.oriented for course in self.courses], dtype=bool)
        arrival = azimuth_of(of.total(self.reference)) - azimuth_of(of.total(legs(azimuth, self.leg_length)))
        first = np.nan_to_num(self._predicted[of.starts[:-1]] - azimuth[of.starts[:-1]])
        return np.where(oriented, 0.0, np.where(self.closed, first, arrival))

    @cached_property
    def misclosure(self) -> FloatArray:
        """East and north (traverses, 2): where the legs lead minus where they ought to."""
        return self.legs.of.total(self.steps - self.reference)

    @cached_property
    def angle_variance(self) -> FloatArray:
        """Variances (corners,) of the angles, rad²."""
        return self.corners.rows.total(self.observed.sd[self.corners.rows.values] ** 2)

    @cached_property
    def angular_sd(self) -> FloatArray:
        """Sds (traverses,) of the sum of all angles."""
        return np.sqrt(self.corners.of.total(self.angle_variance))

    @cached_property
    def sd(self) -> FloatArray:
        """Sds (traverses,) of the linear misclosures.

        Each length moves the end along its leg, each angle across the line from its mark to the end; where the angular
        misclosure is shared out, an angle's error moves the end by its own lever less the mean of all levers. A
        traverse between two marks that nothing orients shows only what is off along the line between them.
        """
        along = self._shown()
        leg, corner = self.legs.of.owner, self.corners.of.owner
        by_length = _square(self.unbalanced / np.hypot(*self.unbalanced.T)[:, None], along[leg])
        by_angle = _square(self._levers() @ QUARTER_TURN, along[corner])
        variance = self.legs.of.total(self.lines.lengths.covariance[self.legs.line, 0, 0] * by_length)
        return np.sqrt(variance + self.corners.of.total(self.angle_variance * by_angle))

    def _levers(self) -> FloatArray:
        """From each corner (corners, 2) to the end of the legs that it turns, less the mean where they are balanced."""
        at = np.vstack([np.zeros(2), np.cumsum(self.unbalanced, axis=0)])
        levers: FloatArray = at[self.corners.last] - at[self.corners.first]
        balanced = np.array([bool(course.share.any()) for course in self.courses], dtype=bool)
        mean = self.corners.of.total(levers) / np.maximum(self.corners.of.lengths, 1)[:, None]
        return levers - np.where(balanced[:, None], mean, 0.0)[self.corners.of.owner]

    def _shown(self) -> FloatArray:
        """The direction (traverses, 2) along which a misclosure shows, NaN where it shows in all."""
        arrival = self.legs.of.total(self.reference)
        oriented = np.array([course.oriented for course in self.courses], dtype=bool)
        everywhere = oriented | self.closed
        length = np.where(everywhere, 1.0, np.hypot(*arrival.T))
        return np.where(everywhere[:, None], np.nan, arrival / length[:, None])


def _square(moves: FloatArray, along: FloatArray) -> FloatArray:
    """Squared lengths (moves,) of moves (moves, 2), or of their parts along unit vectors where those are given."""
    part = np.einsum("mi,mi->m", moves, np.nan_to_num(along))
    whole = np.einsum("mi,mi->m", moves, moves)
    squares: FloatArray = np.where(np.isnan(along[:, 0]), whole, part**2)
    return squares


def _turned(steps: FloatArray, angle: FloatArray) -> FloatArray:
    """Steps (legs, 2) turned clockwise by angles (legs,)."""
    sine, cosine = np.sin(angle), np.cos(angle)
    east, north = steps.T
    return np.column_stack([east * cosine + north * sine, north * cosine - east * sine])
