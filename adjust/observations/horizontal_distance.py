"""Distances already reduced to the horizontal at the mean height of the two marks."""

from __future__ import annotations

from dataclasses import dataclass

from adjust.arrays import FloatArray
from adjust.frames import Geometry
from adjust.observations.sighted import SightedObservations


@dataclass(frozen=True, kw_only=True)
class HorizontalDistances(SightedObservations):
    """Distances between the verticals of two marks at their mean height, metres."""

    kind = "horizontal_distance"
    table = "distances"
    roles = ("at", "to")
    unit = "m"
    determines_plan = True
    determines_height = False

    def predict(self, geometry: Geometry) -> FloatArray:
        """See `Frame.level_distance`; (rows, 1)."""
        return self.linearise(geometry)[0]

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """See `Frame.level_distance`; (rows, 1, 2, 3)."""
        return self.linearise(geometry)[1]

    def linearise(self, geometry: Geometry) -> tuple[FloatArray, FloatArray]:
        """Prediction and derivatives at once."""
        distance, derivatives = geometry.level_distance(self.marks[:, 0], self.marks[:, 1])
        return distance[:, None], derivatives[:, None]
