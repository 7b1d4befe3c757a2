"""What a frame answers: from coordinates to the geometry between marks, and back to a map's numbers."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar, Literal

from adjust.arrays import FloatArray, IntArray


@dataclass(frozen=True)
class Sight(ABC):
    """Lines of sight, and how they change as their marks move."""

    enu: FloatArray
    """(rows, 3): from instrument to target along east, north, up at the station, metres."""

    @abstractmethod
    def differentiate(self, gradient: FloatArray) -> FloatArray:
        """Derivatives (rows, 2, 3) of a quantity by metres east, north, up at the station and at the target mark.

        `gradient` (rows, 3) holds the quantity's derivatives by `enu`.
        """


class Frame(ABC):
    """A coordinate frame. Coordinates are (n, 3): east-like, north-like, height.

    Plane frame: easting, northing, height, metres. Ellipsoid frame: longitude, latitude (radians), ellipsoidal height.
    East-like comes first everywhere (x, y order). NaN stands where a mark has no such coordinate.
    """

    kind: ClassVar[Literal["plane", "ellipsoid"]]

    @abstractmethod
    def sight(
        self,
        coordinates: FloatArray,
        at: IntArray,
        to: IntArray,
        heights: FloatArray,
        deflection: FloatArray | None,
    ) -> Sight:
        """Sights from `at` to `to` (rows,), instrument and target `heights` (rows, 2) above the marks, metres.

        `deflection` (n, 2), radians, north and east components at the marks, turns a station's axes from the
        ellipsoid's normal to the plumb line; None leaves them on the normal.
        """

    @abstractmethod
    def level_distance(self, coordinates: FloatArray, at: IntArray, to: IntArray) -> tuple[FloatArray, FloatArray]:
        """Distance (rows,) between the verticals at the two marks' mean height, and derivatives (rows, 2, 3)."""

    @abstractmethod
    def moved(self, coordinates: FloatArray, corrections: FloatArray) -> FloatArray:
        """Coordinates after moving each mark by `corrections` (n, 3) metres east, north, up."""

    @abstractmethod
    def displacement(self, start: FloatArray, end: FloatArray) -> FloatArray:
        """The metres east, north, up (n, 3) that lead from `start` to `end`, for steps small beside the Earth."""

    @abstractmethod
    def grid_rotation(self, coordinates: FloatArray) -> FloatArray:
        """Azimuth (n,) of grid north at each mark, radians clockwise from the frame's north.

        0 where the frame's north is the grid's. NaN where a mark has no plan coordinates.
        """

    @abstractmethod
    def grid_coordinates(self, coordinates: FloatArray) -> FloatArray:
        """Easting and northing (n, 2) in metres; NaN where the frame has no grid."""

    @abstractmethod
    def geographic(self, coordinates: FloatArray) -> FloatArray:
        """Longitude and latitude (n, 2) in radians; NaN where the frame has none."""
