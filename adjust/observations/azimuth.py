"""Azimuths: directions that carry their own orientation, from gyroscope, star or grid."""

from __future__ import annotations

from dataclasses import dataclass

from adjust.arrays import FloatArray
from adjust.frames import Geometry, Sight
from adjust.observations.direction import azimuth_gradient, azimuth_of
from adjust.observations.sighted import SingleSight


@dataclass(frozen=True, kw_only=True)
class Azimuths(SingleSight):
    """Azimuths, radians clockwise from the plane grid's north, or from the geodetic meridian in an ellipsoid frame."""

    kind = "azimuth"
    table = "azimuths"
    unit = "rad"
    full_circle = True
    determines_plan = True
    determines_height = False

    def sight(self, geometry: Geometry) -> Sight:
        """Mark to mark, in axes of the ellipsoid normal: a geodetic azimuth knows no deflection."""
        return geometry.sight(self.marks[:, 0], self.marks[:, 1])

    def value(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """See `azimuth_of`."""
        return azimuth_of(enu)

    def gradient(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """See `azimuth_gradient`."""
        return azimuth_gradient(enu)
