"""Horizontal angles between two sights from one station."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Geometry, Sight
from adjust.observations.direction import azimuth_gradient, azimuth_of
from adjust.observations.sighted import SightedObservations


@dataclass(frozen=True, kw_only=True)
class Angles(SightedObservations):
    """Angles, radians clockwise from the sight to `from` to the sight to `to`."""

    kind = "angle"
    table = "angles"
    roles = ("at", "from", "to")
    unit = "rad"
    full_circle = True
    determines_plan = True
    determines_height = False

    def predict(self, geometry: Geometry) -> FloatArray:
        """Difference of two azimuths (rows, 1), −2π … 2π."""
        return self._difference(self._sight(geometry, 1), self._sight(geometry, 2))

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """(rows, 1, 3, 3): the station turns both sights, each target its own."""
        return self.linearise(geometry)[1]

    def linearise(self, geometry: Geometry) -> tuple[FloatArray, FloatArray]:
        """Prediction and derivatives of the same pairs of sights."""
        back, fore = self._sight(geometry, 1), self._sight(geometry, 2)
        by_back, by_fore = (sight.differentiate(azimuth_gradient(sight.enu)) for sight in (back, fore))
        derivatives = np.stack([by_fore[:, 0] - by_back[:, 0], -by_back[:, 1], by_fore[:, 1]], axis=1)
        return self._difference(back, fore), derivatives[:, None]

    def _sight(self, geometry: Geometry, role: int) -> Sight:
        """Mark to mark, in axes turned to the plumb line."""
        at: IntArray = self.marks[:, 0]
        return geometry.sight(at, self.marks[:, role], plumb=True)

    def _difference(self, back: Sight, fore: Sight) -> FloatArray:
        return (azimuth_of(fore.enu) - azimuth_of(back.enu))[:, None]
