"""Weighted control: given coordinates that count as observations."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Geometry
from adjust.observations.base import Observations


@dataclass(frozen=True, kw_only=True)
class ControlCoordinates(Observations):
    """One coordinate of one mark a row: how far it stands from its given value, metres.

    `observed` is 0: the prediction is the displacement from the given to the present coordinates along the grid's
    east, the grid's north, or up.
    """

    kind = "control"
    table = "marks"
    roles = ("at",)
    unit = "m"
    determines_plan = False
    determines_height = False

    component: IntArray
    """(rows,): 0 easting, 1 northing, 2 height."""
    given: FloatArray
    """(rows, 3): the frame's coordinates, heights in the job's own height system; NaN where not given."""
    sd: FloatArray
    """(rows,), metres."""

    def predict(self, geometry: Geometry) -> FloatArray:
        """Displacement (rows, 1) along each row's axis of the grid at the given position."""
        displacement = geometry.displacement(self.given, self.marks[:, 0])
        axis = self._axis(geometry)
        along: FloatArray = np.where(axis == 0.0, 0.0, axis * displacement).sum(axis=1)
        return along[:, None]

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """The axis itself (rows, 1, 1, 3). The angle between the given and the present mark's vertical is left out: it
        matters by one part in a million where a mark is six metres off."""
        return self._axis(geometry)[:, None, None]

    def covariance(self, geometry: Geometry) -> FloatArray:
        """sd² (rows, 1, 1)."""
        return self.sd[:, None, None] ** 2

    def _axis(self, geometry: Geometry) -> FloatArray:
        """Unit vectors (rows, 3) of the grid's easting, northing or height along the frame's east, north, up."""
        rotation = np.where(self.component == 2, 0.0, geometry.frame.grid_rotation(self.given))
        sine, cosine = np.sin(rotation), np.cos(rotation)
        zero, one = np.zeros_like(sine), np.ones_like(sine)
        axes = np.array([[cosine, -sine, zero], [sine, cosine, zero], [zero, zero, one]])
        return axes[self.component, :, np.arange(len(self))]
