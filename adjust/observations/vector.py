"""GNSS baseline vectors in geocentric axes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import EllipsoidFrame, Geometry
from adjust.frames.reference_ellipsoid import Stations
from adjust.observations.base import Observations


@dataclass(frozen=True, kw_only=True)
class Vectors(Observations):
    """Geocentric ΔX, ΔY, ΔZ, metres: `to` minus `from`, mark to mark. Only an ellipsoid frame can hold them."""

    kind = "vector"
    table = "vectors"
    roles = ("from", "to")
    components = ("x", "y", "z")
    unit = "m"
    determines_plan = True
    determines_height = True

    covariances: FloatArray
    """(rows, 3, 3), m², of each vector's three components."""

    def predict(self, geometry: Geometry) -> FloatArray:
        """Differences (rows, 3) of geocentric positions. Raises TypeError in a plane frame."""
        return self._ends(geometry, 1).positions - self._ends(geometry, 0).positions

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """(rows, 3, 2, 3): the local axes at each mark, as columns. Raises TypeError in a plane frame."""
        return self.linearise(geometry)[1]

    def linearise(self, geometry: Geometry) -> tuple[FloatArray, FloatArray]:
        """Prediction and derivatives at once. Raises TypeError in a plane frame."""
        start, end = self._ends(geometry, 0), self._ends(geometry, 1)
        derivatives = np.stack([-start.axes, end.axes], axis=1).transpose(0, 3, 1, 2)
        return end.positions - start.positions, derivatives

    def covariance(self, geometry: Geometry) -> FloatArray:
        """As given with the vectors."""
        return self.covariances

    def _ends(self, geometry: Geometry, role: int) -> Stations:
        if not isinstance(geometry.frame, EllipsoidFrame):
            raise TypeError("GNSS vectors need an ellipsoid frame")
        return geometry.frame.stations(geometry.spatial, self.marks[:, role])
