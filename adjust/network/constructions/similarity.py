"""The similarity transformation that lays one figure over another."""

from __future__ import annotations

import cmath
from collections.abc import Sequence
from dataclasses import dataclass

SHORTEST_BASE = 1e-3
"""Points that spread by a smaller share of the figure's distance from their centroid do not turn it: an orientation off
a line of ten metres is no good at ten kilometres."""


@dataclass(frozen=True)
class Similarity:
    """z → turn · z + shift, where `turn` holds rotation and scale; of the mirrored z̄ where `mirrored`."""

    turn: complex
    shift: complex
    mirrored: bool = False

    def __call__(self, point: complex) -> complex:
        return self.turn * (point.conjugate() if self.mirrored else point) + self.shift


def fit(
    source: Sequence[complex], target: Sequence[complex], *, keep_scale: bool, mirrored: bool = False
) -> Similarity | None:
    """The least-squares similarity from source to target points (two or more); None where the sources coincide.

    With z and w from their centroids, turn = Σ z̄ w / Σ z̄ z; a kept scale takes its argument alone. The plane case of
    Horn (1987), *Journal of the Optical Society of America A* 4(4), 629–642, in complex numbers.
    """
    points = [point.conjugate() for point in source] if mirrored else list(source)
    middle, aim = sum(points) / len(points), sum(target) / len(target)
    spread = sum(abs(point - middle) ** 2 for point in points)
    agreement = sum((p - middle).conjugate() * (t - aim) for p, t in zip(points, target, strict=True))
    if spread == 0.0 or agreement == 0.0:
        return None
    turn = agreement / abs(agreement) if keep_scale else agreement / spread
    return Similarity(turn, aim - turn * middle, mirrored)


def worst_gap(similarity: Similarity, source: Sequence[complex], target: Sequence[complex]) -> float:
    """The largest distance, metres, between a transformed and its target point."""
    return max(abs(similarity(point) - aim) for point, aim in zip(source, target, strict=True))


def free_station(readings: Sequence[tuple[float, float]], targets: Sequence[complex]) -> complex | None:
    """The station that sees known targets by (direction, distance), radians and metres: two or more.

    Its polar points, in the circle's own axes, are laid over the targets; the station is the image of the origin.
    None where the targets lie too close together to turn the figure. Common practice, no source.
    """
    points = [cmath.rect(distance, direction) for direction, distance in readings]
    middle = sum(points) / len(points)
    if max(abs(point - middle) for point in points) < SHORTEST_BASE * max(abs(point) for point in points):
        return None
    similarity = fit(points, targets, keep_scale=True)
    return None if similarity is None else similarity.shift
