"""Where a mark may lie for one observation: on a ray, on a circle, on the arc that sees two marks under an angle.

Two loci meet in at most two points; every other locus tells how well a point fits.
"""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass

PARALLEL = 0.01
"""Sine of the flattest crossing of two loci that is worth a point: under half a degree an error of observation comes
out more than a hundred times as large in the point. Common practice asks for 30°; a start bears far less."""

NEARLY_TOUCHING = 0.02
"""Share of the smaller radius by which two circles may miss each other and still be taken to touch: distances that were
not yet reduced to the horizontal are too long by this much on a slope of 1 in 5."""

WORST = 2.0
"""Misfit of a point where a locus has no meaning, and the largest misfit of a ray: it points the other way."""


@dataclass(frozen=True)
class Ray:
    """The half-line from a known point in a known azimuth; `direction` has length 1."""

    origin: complex
    direction: complex

    def misfit(self, point: complex) -> float:
        """Length of the chord between the seen and the observed direction: the angle between them when small."""
        sight = point - self.origin
        return abs(sight / abs(sight) - self.direction) if sight else WORST


@dataclass(frozen=True)
class Circle:
    """All points at a distance from a known point."""

    centre: complex
    radius: float

    def misfit(self, point: complex) -> float:
        """Difference from the distance, as a share of it."""
        return abs(abs(point - self.centre) / self.radius - 1.0)


@dataclass(frozen=True)
class Arc:
    """All points from which `second` is seen `angle` radians clockwise of `first`."""

    first: complex
    second: complex
    angle: float

    def misfit(self, point: complex) -> float:
        """Chord between the seen and the observed angle: their difference when small."""
        back, fore = self.first - point, self.second - point
        if not back or not fore:
            return WORST
        seen = fore / back
        return abs(seen / abs(seen) - cmath.rect(1.0, self.angle))

    def curve(self) -> Circle | Ray | None:
        """The circle that the arc is part of, a line where the angle is 0 or π; None where the two marks coincide.

        The angle at the centre is twice the angle at the circumference (Euclid, *Elements* III.20), so that
        second − c = (first − c) e^{2iβ}.
        """
        base = self.second - self.first
        if not base:
            return None
        double = cmath.rect(1.0, 2.0 * self.angle)
        if abs(1.0 - double) < PARALLEL**2:
            return Ray(self.first, base / abs(base))
        centre = (self.second - double * self.first) / (1.0 - double)
        return Circle(centre, abs(self.first - centre))


Locus = Ray | Circle | Arc


def meetings(one: Locus, other: Locus) -> list[complex]:
    """The points where two loci's lines or circles cross, none where they cross too flatly to tell where.

    They lie on the whole line or circle: ask the loci for the misfit.
    """
    first, second = _curve(one), _curve(other)
    if first is None or second is None:
        return []
    if isinstance(first, Ray):
        return _lines_meet(first, second) if isinstance(second, Ray) else _line_meets_circle(first, second)
    return _line_meets_circle(second, first) if isinstance(second, Ray) else _circles_meet(first, second)


def _curve(locus: Locus) -> Ray | Circle | None:
    return locus.curve() if isinstance(locus, Arc) else locus


def _lines_meet(one: Ray, other: Ray) -> list[complex]:
    """Forward intersection: the sine rule in the triangle of the two origins and the point."""
    crossing = _cross(one.direction, other.direction)
    if abs(crossing) < PARALLEL:
        return []
    return [one.origin + one.direction * (_cross(other.origin - one.origin, other.direction) / crossing)]


def _line_meets_circle(line: Ray, circle: Circle) -> list[complex]:
    """The foot of the perpendicular from the centre, and half a chord to either side."""
    to_origin = line.origin - circle.centre
    foot = line.origin - line.direction * _dot(to_origin, line.direction)
    return _either_side(foot, line.direction, circle.radius, abs(foot - circle.centre))


def _circles_meet(one: Circle, other: Circle) -> list[complex]:
    """The foot of their common chord on the line of centres, and half the chord to either side."""
    between = other.centre - one.centre
    apart = abs(between)
    smaller, larger = sorted((one.radius, other.radius))
    if apart < PARALLEL * smaller:
        return []
    along = between / apart
    if not larger - smaller < apart < larger + smaller:
        return _nearly_touching(one, other, along, apart)
    to_foot = (apart**2 + one.radius**2 - other.radius**2) / (2.0 * apart)
    return _either_side(one.centre + along * to_foot, along * 1j, one.radius, abs(to_foot))


def _nearly_touching(one: Circle, other: Circle, along: complex, apart: float) -> list[complex]:
    """The point midway in the gap of two circles that just miss each other."""
    if apart >= one.radius + other.radius:
        ends = one.centre + along * one.radius, other.centre - along * other.radius
    else:
        outward = along if one.radius > other.radius else -along
        ends = one.centre + outward * one.radius, other.centre + outward * other.radius
    gap = abs(ends[1] - ends[0])
    return [(ends[0] + ends[1]) / 2] if gap < NEARLY_TOUCHING * min(one.radius, other.radius) else []


def _either_side(foot: complex, along: complex, radius: float, distance: float) -> list[complex]:
    """Both ends of a chord; its middle where it just misses the circle."""
    square = radius**2 - distance**2
    if square <= 0.0:
        return [foot] if distance < (1.0 + NEARLY_TOUCHING) * radius else []
    half = math.sqrt(square)
    return [foot - along * half, foot + along * half]


def _cross(one: complex, other: complex) -> float:
    return one.real * other.imag - one.imag * other.real


def _dot(one: complex, other: complex) -> float:
    return one.real * other.real + one.imag * other.imag
