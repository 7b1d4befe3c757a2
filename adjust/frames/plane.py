"""The plane frame: rectangular easting, northing and height."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames.base import Frame, Sight


@dataclass(frozen=True)
class PlaneSight(Sight):
    """Sights along axes that are the same everywhere."""

    def differentiate(self, gradient: FloatArray) -> FloatArray:
        """A step of the target lengthens the sight as it is, a step of the station shortens it."""
        return np.stack([-gradient, gradient], axis=1)


@dataclass(frozen=True)
class PlaneFrame(Frame):
    """Rectangular coordinates; `earth_curvature` lets zenith angles allow for curvature and refraction."""

    kind = "plane"
    earth_curvature: bool = True

    def sight(
        self,
        coordinates: FloatArray,
        at: IntArray,
        to: IntArray,
        heights: FloatArray,
        deflection: FloatArray | None,
    ) -> Sight:
        """Differences of coordinates; a plane frame knows no deflection."""
        enu = coordinates[to] - coordinates[at]
        enu[:, 2] += heights[:, 1] - heights[:, 0]
        return PlaneSight(enu)

    def level_distance(self, coordinates: FloatArray, at: IntArray, to: IntArray) -> tuple[FloatArray, FloatArray]:
        """Plan distance √(ΔE² + ΔN²)."""
        difference = coordinates[to, :2] - coordinates[at, :2]
        distance = np.hypot(difference[:, 0], difference[:, 1])
        derivatives = np.zeros((len(at), 2, 3))
        with np.errstate(divide="ignore", invalid="ignore"):
            derivatives[:, 1, :2] = difference / distance[:, None]
        derivatives[:, 0] = -derivatives[:, 1]
        return distance, derivatives

    def moved(self, coordinates: FloatArray, corrections: FloatArray) -> FloatArray:
        """Metres are metres."""
        return coordinates + corrections

    def displacement(self, start: FloatArray, end: FloatArray) -> FloatArray:
        """Difference of coordinates."""
        return end - start

    def grid_rotation(self, coordinates: FloatArray) -> FloatArray:
        """The frame is its own grid."""
        return np.zeros(len(coordinates))

    def grid_coordinates(self, coordinates: FloatArray) -> FloatArray:
        """Easting and northing as they are."""
        return coordinates[:, :2]

    def geographic(self, coordinates: FloatArray) -> FloatArray:
        """A plane frame has no longitude and latitude."""
        return np.full((len(coordinates), 2), np.nan)
