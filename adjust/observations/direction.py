"""Directions of a round: readings of the horizontal circle that share one unknown orientation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Geometry, Sight
from adjust.observations.sighted import SightedObservations


def azimuth_of(sight: Sight) -> FloatArray:
    """Azimuths atan2(e, n) (rows,), radians clockwise from north, −π … π."""
    return np.arctan2(sight.enu[:, 0], sight.enu[:, 1])


def azimuth_derivatives(sight: Sight) -> FloatArray:
    """Derivatives (rows, 2, 3) of atan2(e, n) by metres at the station and at the target."""
    east, north = sight.enu[:, 0], sight.enu[:, 1]
    square = east**2 + north**2
    outer = np.stack([north / square, -east / square, np.zeros_like(east)], axis=1)
    return np.stack([np.einsum("rk,rkm->rm", outer, sight.by_at), np.einsum("rk,rkm->rm", outer, sight.by_to)], axis=1)


@dataclass(frozen=True, kw_only=True)
class Directions(SightedObservations):
    """Directions, radians clockwise: azimuth at the station minus the orientation of the setup."""

    kind = "direction"
    table = "directions"
    roles = ("at", "to")
    unit = "rad"
    determines_plan = True
    determines_height = False

    setup_index: IntArray

    @property
    def setup(self) -> IntArray:
        """Setup of each row; its orientation is the azimuth of the circle's zero."""
        return self.setup_index

    def predict(self, geometry: Geometry) -> FloatArray:
        """Azimuths in axes turned to the plumb line."""
        return azimuth_of(geometry.sight(self.marks[:, 0], self.marks[:, 1], plumb=True))[:, None]

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """See `azimuth_derivatives`."""
        return azimuth_derivatives(geometry.sight(self.marks[:, 0], self.marks[:, 1], plumb=True))[:, None]
