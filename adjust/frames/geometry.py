"""Where all marks stand at one moment: the frame, the coordinates and what bends a line of sight."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames.base import Frame, Sight


@dataclass(frozen=True)
class Geometry:
    """The marks of a job at their present coordinates.

    `coordinates` (n, 3) as in `Frame`, but heights in the job's own height system: orthometric when `orthometric`,
    else ellipsoidal (in a plane frame there is only one). `geoid` (n,) is the geoid above the ellipsoid, metres;
    `deflection` (n, 2) the north and east components, radians; `refraction` the coefficient k.
    """

    frame: Frame
    coordinates: FloatArray
    geoid: FloatArray
    deflection: FloatArray
    orthometric: bool
    refraction: float

    @property
    def spatial(self) -> FloatArray:
        """Coordinates (n, 3) with heights above the ellipsoid (plane frame: as they are)."""
        if not self.orthometric:
            return self.coordinates
        return _raised(self.coordinates, self.geoid)

    @property
    def levelled_heights(self) -> FloatArray:
        """Heights (n,) that spirit levelling compares: orthometric, metres."""
        return self.coordinates[:, 2] if self.orthometric else self.coordinates[:, 2] - self.geoid

    def sight(self, at: IntArray, to: IntArray, heights: FloatArray | None = None, *, plumb: bool = False) -> Sight:
        """Sights between marks; `plumb` turns the axes to the plumb line at the station. See `Frame.sight`."""
        above = np.zeros((len(at), 2)) if heights is None else heights
        return self.frame.sight(self.spatial, at, to, above, self.deflection if plumb else None)

    def level_distance(self, at: IntArray, to: IntArray) -> tuple[FloatArray, FloatArray]:
        """See `Frame.level_distance`."""
        return self.frame.level_distance(self.spatial, at, to)

    def moved(self, corrections: FloatArray) -> Geometry:
        """The same marks after `corrections` (n, 3), metres east, north, up."""
        moved = self.frame.moved(self.spatial, corrections)
        return replace(self, coordinates=_raised(moved, -self.geoid) if self.orthometric else moved)

    def displacement(self, start: FloatArray, marks: IntArray) -> FloatArray:
        """Metres east, north, up (rows, 3) from `start` (rows, 3), heights in the job's height system, to `marks`."""
        if not self.orthometric:
            return self.frame.displacement(start, self.coordinates[marks])
        return self.frame.displacement(_raised(start, self.geoid[marks]), self.spatial[marks])


def _raised(coordinates: FloatArray, by: FloatArray) -> FloatArray:
    """Coordinates (n, 3) with `by` (n,) metres added to their heights."""
    raised = coordinates.copy()
    raised[:, 2] += by
    return raised
