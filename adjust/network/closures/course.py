"""A traverse's legs with their azimuths: angles carried from stand to stand, the angular misclosure shared out."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import FloatArray
from adjust.network.closures.orientation import Orientations
from adjust.network.closures.traverses import Step, Walk


@dataclass(frozen=True)
class Stand:
    """A station of a traverse: its group of readings, the nodes of the sights back and on (−1: none), the orientation
    of the group relative to the first one of its part, and the number of legs before it."""

    group: int
    entering: int
    leaving: int
    rotation: float
    legs: int


@dataclass(frozen=True)
class Corner:
    """An angle that a traverse rests on, between two nodes of a group; it turns the legs from `first` up to `last`."""

    one: int
    other: int
    first: int
    last: int


@dataclass(frozen=True)
class Part:
    """Stands that hang together by measured angles, and the azimuths of their legs relative to the first stand."""

    stands: list[Stand]
    azimuths: list[float]
    legs: int
    """Legs of the traverse before this part."""
    turn: float | None
    """Of a closed traverse, all the way round: radians."""

    @property
    def last(self) -> int:
        """Legs of the traverse up to the end of this part."""
        return self.legs + len(self.azimuths)


@dataclass(frozen=True)
class Course:
    """A traverse leg by leg; arrays (legs,). `marks` are those it passes, first and last included.

    `azimuth` radians, from an arbitrary north unless `oriented`. `angular` is the angular misclosure, 0 where nothing
    shows one; `share` the part of it that each leg's azimuth carries when every angle takes an equal part.
    """

    legs: list[Step]
    marks: list[int]
    azimuth: FloatArray
    share: FloatArray
    angular: float
    corners: list[Corner]
    oriented: bool


class Courses:
    """Finds the azimuths of traverses' legs."""

    def __init__(self, orientations: Orientations) -> None:
        self._reading: list[float] = orientations.stations.reading.tolist()
        self._oriented: list[bool] = orientations.oriented.tolist()
        self._orientation: list[float] = orientations.orientation.tolist()
        self._tie: list[int] = orientations.tie.node.tolist()

    def course(self, walk: Walk) -> Course | None:
        """The course of a walk; None where its parts have no north in common, or it has no legs to speak of."""
        parts = self._parts(walk)
        norths = [next((stand for stand in part.stands if self._oriented[stand.group]), None) for part in parts]
        if len(parts) > 1 and None in norths:
            return None
        zeros = [0.0 if north is None else self._orientation[north.group] - north.rotation for north in norths]
        azimuth = [zero + angle for zero, part in zip(zeros, parts, strict=True) for angle in part.azimuths]
        angular, share = self._angular(parts[0], zeros[0]) if len(parts) == 1 else (0.0, np.zeros(len(azimuth)))
        corners = [corner for part, north in zip(parts, norths, strict=True) for corner in self._corners(part, north)]
        legs = [step for step in walk if step.line >= 0]
        marks = [leg.start for leg in legs] + [leg.end for leg in legs[-1:]]
        return Course(legs, marks, np.array(azimuth), share, angular, corners, None not in norths)

    def _parts(self, walk: Walk) -> list[Part]:
        """The walk, cut where it passes over a bare mark."""
        cuts = [place for place, step in enumerate(walk) if step.group < 0] or [0]
        parts: list[Part] = []
        for begin, end in zip(cuts, [*cuts[1:], len(walk)], strict=True):
            parts.append(self._part(walk[begin:end], parts[-1].last if parts else 0))
        return parts

    def _part(self, steps: list[Step], legs: int) -> Part:
        closed = steps[0].group >= 0
        stands = [Stand(steps[0].group, -1, -1, 0.0, legs)] if closed else []
        azimuths: list[float] = []
        for step in steps:
            rotation = stands[-1].rotation if stands else 0.0
            if step.group >= 0:
                stands[-1] = replace(stands[-1], leaving=step.leaving)
                rotation += step.turn if step.next_group >= 0 else 0.0
            if step.line >= 0:
                azimuths.append(self._azimuth(step, stands[-1].rotation if stands else 0.0))
            if step.next_group >= 0:
                stands.append(Stand(step.next_group, step.entering, -1, rotation, legs + len(azimuths)))
        if not closed:
            return Part(stands, azimuths, legs, None)
        again = stands.pop()
        stands[0] = replace(stands[0], entering=again.entering)
        return Part(stands, azimuths, legs, again.rotation)

    def _azimuth(self, step: Step, rotation: float) -> float:
        """By the sight on from the leg's start, else by the sight back from its end."""
        if step.leaving >= 0:
            return self._reading[step.leaving] + rotation
        return self._reading[step.entering] + rotation + math.pi

    def _angular(self, part: Part, zero: float) -> tuple[float, FloatArray]:
        """The angular misclosure of a traverse in one part, and the share of it that each leg carries."""
        count = len(part.azimuths)
        if part.turn is not None:
            return _wrapped(part.turn), np.arange(count) / count
        stands = part.stands
        ends = stands[:1] + stands[1:][-1:]
        if len(ends) < 2 or not all(self._oriented[stand.group] for stand in ends):
            return 0.0, np.zeros(count)
        angular = _wrapped(stands[-1].rotation + zero - self._orientation[stands[-1].group])
        passed = np.searchsorted([stand.legs for stand in stands], np.arange(count), side="right")
        return angular, passed / len(stands)

    def _corners(self, part: Part, north: Stand | None) -> list[Corner]:
        corners = []
        for stand in part.stands:
            at_end = stand is part.stands[-1] and self._oriented[stand.group]
            tie = self._tie[stand.group] if stand is north or at_end else -1
            one, other = (node if node >= 0 else tie for node in (stand.entering, stand.leaving))
            if one >= 0 and other >= 0 and one != other:
                corners.append(Corner(one, other, stand.legs, part.last))
        return corners


def _wrapped(angle: float) -> float:
    """Between −π and π."""
    return (angle + math.pi) % (2.0 * math.pi) - math.pi
