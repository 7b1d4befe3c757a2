"""Slope distances from instrument to target."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import Geometry, Sight
from adjust.observations.sighted import HeightedSight


def length_of(enu: FloatArray) -> FloatArray:
    """Lengths (rows,) of sights (rows, 3), metres."""
    squares: FloatArray = np.einsum("ri,ri->r", enu, enu)
    return np.sqrt(squares)


@dataclass(frozen=True, kw_only=True)
class SlopeDistances(HeightedSight):
    """Straight distances between instrument and target, metres.

    They help a height that something else makes an unknown. By themselves, on lines near the level, they would
    determine it badly, and take it as given.
    """

    kind = "slope_distance"
    table = "distances"
    unit = "m"
    determines_plan = True
    determines_height = False

    def sight(self, geometry: Geometry) -> Sight:
        """Instrument to target; the axes do not matter."""
        return geometry.sight(self.marks[:, 0], self.marks[:, 1], self.heights)

    def value(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """√(e² + n² + u²)."""
        return length_of(enu)

    def gradient(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """The unit vector along the sight; NaN where it has no length."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return enu / length_of(enu)[:, None]
