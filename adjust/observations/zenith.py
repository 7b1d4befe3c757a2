"""Zenith angles from instrument to target, bent by refraction."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import Geometry, PlaneFrame, Sight
from adjust.observations.sighted import HeightedSight
from adjust.observations.slope_distance import length_of

EARTH_RADIUS = 6_371_000.0
"""Mean radius of the Earth, metres: (2a + b)/3 of GRS 80 is 6 371 008.8 (Moritz 2000, *Journal of Geodesy* 74); round
figure by common practice."""


@dataclass(frozen=True)
class Bending:
    """What the level surface and the ray do to a zenith angle over the distance.

    `fall`: share of s²/2R by which a level line rises above the plane's horizontal as the target sees it, 1 − k in a
    plane frame that allows for curvature. `refraction`: the k of k·slope/2R, where the geometry itself is curved.
    """

    fall: float
    refraction: float

    @classmethod
    def of(cls, geometry: Geometry) -> Bending:
        """The bending that a frame calls for."""
        if not isinstance(geometry.frame, PlaneFrame):
            return cls(0.0, geometry.refraction)
        return cls(1.0 - geometry.refraction if geometry.frame.earth_curvature else 0.0, 0.0)


@dataclass(frozen=True, kw_only=True)
class ZenithAngles(HeightedSight):
    """Zenith angles, radians: 0 up, π/2 level."""

    kind = "zenith"
    table = "zeniths"
    unit = "rad"
    determines_plan = False
    determines_height = True

    def sight(self, geometry: Geometry) -> Sight:
        """Instrument to target, in axes turned to the plumb line."""
        return geometry.sight(self.marks[:, 0], self.marks[:, 1], self.heights, plumb=True)

    def value(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """Plane: atan2(s, u − (1 − k) s²/2R), or atan2(s, u) without curvature; ellipsoid: atan2(s, u) − k·slope/2R.

        s is √(e² + n²), R is `EARTH_RADIUS`.
        """
        bending = Bending.of(geometry)
        level = np.hypot(enu[:, 0], enu[:, 1])
        rise = enu[:, 2] - bending.fall * level**2 / (2.0 * EARTH_RADIUS)
        return np.arctan2(level, rise) - bending.refraction * length_of(enu) / (2.0 * EARTH_RADIUS)

    def gradient(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """Derivatives by e, n, u, rad/m; by e and n they are NaN for a vertical sight, where the angle has a cusp."""
        bending = Bending.of(geometry)
        level = np.hypot(enu[:, 0], enu[:, 1])
        rise = enu[:, 2] - bending.fall * level**2 / (2.0 * EARTH_RADIUS)
        square = level**2 + rise**2
        with np.errstate(divide="ignore", invalid="ignore"):
            by_level = (rise + bending.fall * level**2 / EARTH_RADIUS) / (square * level)
            gradient = np.column_stack([enu[:, 0] * by_level, enu[:, 1] * by_level, -level / square])
            return gradient - bending.refraction / (2.0 * EARTH_RADIUS) * enu / length_of(enu)[:, None]
