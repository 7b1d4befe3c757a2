"""Resection: a station from the directions in which it sees three or more known marks."""

from __future__ import annotations

import cmath
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

DANGER = 1e-4
"""Singular value, relative to the largest, below which a resection tells nothing: the station and the marks lie on one
circle, or so nearly that two seconds of arc (1e-5 rad) move it by a tenth of the figure."""


@dataclass(frozen=True)
class Resected:
    """The station, or None where it lies on the danger circle through the marks it sees."""

    station: complex | None
    on_danger_circle: bool


def resect(readings: Sequence[float], targets: Sequence[complex]) -> Resected:
    """Closed solution from directions (radians, clockwise) to three or more known targets.

    With w = s e^{−iω} for the orientation ω and v = w · station, each ray says Im((w · target − v) e^{−i reading}) = 0:
    linear and homogeneous in the four real unknowns of w and v, so the station is v / w of the null vector. Where
    target and station lie on one circle the null space has two dimensions. Several rays are met in the least squares
    of this form; the direct linear transformation of Hartley & Zisserman (2004), *Multiple View Geometry*, section 7.1,
    for a camera in the plane.
    """
    points = np.array(targets)
    middle = points.mean()
    size = np.abs(points - middle).max()
    if size == 0.0:
        return Resected(None, False)
    back = np.exp(-1j * np.array(readings))
    turned = (points - middle) / size * back
    rows = np.column_stack([turned.imag, turned.real, -back.imag, -back.real])
    singular, right = np.linalg.svd(rows)[1:]
    if singular[2] < DANGER * singular[0]:
        return Resected(None, True)
    turn, moved = complex(*right[3, :2]), complex(*right[3, 2:])
    if abs(turn) < DANGER:
        return Resected(None, False)
    return Resected(complex(middle + size * moved / turn), False)


def ahead(readings: Sequence[float], targets: Sequence[complex], station: complex) -> bool:
    """Whether the rays point towards the targets, not away from them: the linear form cannot tell the two apart."""
    orientation = [(t - station) * cmath.rect(1.0, -r) for r, t in zip(readings, targets, strict=True)]
    mean = sum(turn / abs(turn) for turn in orientation if turn)
    return all((turn / mean).real > 0.0 for turn in orientation) if mean else False
