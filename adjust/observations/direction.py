"""Directions of a round: readings of the horizontal circle that share one unknown orientation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Geometry, Sight
from adjust.observations.sighted import SingleSight


def azimuth_of(enu: FloatArray) -> FloatArray:
    """Azimuths atan2(e, n) (rows,) of sights (rows, 3), radians clockwise from north, −π … π."""
    return np.arctan2(enu[:, 0], enu[:, 1])


def azimuth_gradient(enu: FloatArray) -> FloatArray:
    """Derivatives (rows, 3) of atan2(e, n) by e, n, u, rad/m: (n, −e, 0) / (e² + n²); NaN for a vertical sight."""
    east, north = enu[:, 0], enu[:, 1]
    square = east**2 + north**2
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.column_stack([north, -east, np.zeros_like(east)]) / square[:, None]


@dataclass(frozen=True, kw_only=True)
class Directions(SingleSight):
    """Directions, radians clockwise: azimuth at the station minus the orientation of the setup."""

    kind = "direction"
    table = "directions"
    unit = "rad"
    full_circle = True
    determines_plan = True
    determines_height = False

    setup_index: IntArray

    @property
    def setup(self) -> IntArray:
        """Setup of each row; its orientation is the azimuth of the circle's zero."""
        return self.setup_index

    def sight(self, geometry: Geometry) -> Sight:
        """Mark to mark, in axes turned to the plumb line."""
        return geometry.sight(self.marks[:, 0], self.marks[:, 1], plumb=True)

    def value(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """Azimuth, without the orientation."""
        return azimuth_of(enu)

    def gradient(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """See `azimuth_gradient`."""
        return azimuth_gradient(enu)
