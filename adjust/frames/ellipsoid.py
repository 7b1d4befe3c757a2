"""The ellipsoid frame: longitude, latitude and height on the ellipsoid of any CRS; geometry in geocentric axes."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames.base import Frame, Sight
from adjust.frames.ellipsoid_sight import EllipsoidSight, astronomic_axes
from adjust.frames.projection import MapProjection, read_crs
from adjust.frames.reference_ellipsoid import ReferenceEllipsoid, Stations, local_axes


@dataclass(frozen=True)
class EllipsoidFrame(Frame):
    """Coordinates (n, 3): longitude from Greenwich, latitude (radians), height above the ellipsoid (metres).

    `crs` is anything PROJ reads: a projected or geographic CRS, also with a vertical part, which is ignored.
    Raises ValueError, with a message in words, where PROJ does not know it or it lies on no ellipsoid.
    """

    kind = "ellipsoid"
    crs: str

    def __post_init__(self) -> None:
        _ = self._parts

    @cached_property
    def _parts(self) -> tuple[ReferenceEllipsoid, MapProjection | None]:
        return read_crs(self.crs)

    @property
    def ellipsoid(self) -> ReferenceEllipsoid:
        """The CRS's ellipsoid."""
        return self._parts[0]

    @property
    def _projection(self) -> MapProjection | None:
        return self._parts[1]

    @property
    def is_geographic(self) -> bool:
        """Whether the CRS has no map projection, hence no grid."""
        return self._projection is None

    def geocentric(self, coordinates: FloatArray) -> FloatArray:
        """X, Y, Z (n, 3), metres."""
        return self.ellipsoid.geocentric(coordinates)

    def from_geocentric(self, geocentric: FloatArray) -> FloatArray:
        """Coordinates (n, 3) of geocentric X, Y, Z (n, 3), metres."""
        return self.ellipsoid.geodetic(geocentric)

    def axes(self, coordinates: FloatArray) -> FloatArray:
        """East, north and up (n, 3, 3) of the ellipsoid normal at each mark, as rows in geocentric axes."""
        return local_axes(coordinates[:, 0], coordinates[:, 1])

    def sight(
        self,
        coordinates: FloatArray,
        at: IntArray,
        to: IntArray,
        heights: FloatArray,
        deflection: FloatArray | None,
    ) -> Sight:
        """Sights in geocentric axes, turned to east, north, up at the station; see `Frame.sight`.

        Undefined at the poles, where there is no east.
        """
        station, target = self.stations(coordinates, at), self.stations(coordinates, to)
        line = target.positions - station.positions
        line += heights[:, 1:] * target.axes[:, 2] - heights[:, :1] * station.axes[:, 2]
        slant = np.zeros((len(at), 2)) if deflection is None else deflection[at]
        axes = astronomic_axes(coordinates[at], slant) if np.any(slant) else station.axes
        enu: FloatArray = np.einsum("rij,rj->ri", axes, line)
        return EllipsoidSight(enu, axes, station, target, heights, slant)

    def stations(self, coordinates: FloatArray, rows: IntArray) -> Stations:
        """Positions, axes and radii of the marks in `rows`; each mark is worked out once where it has many rows."""
        if len(rows) < len(coordinates):
            return self.ellipsoid.stations(coordinates[rows])
        return self.ellipsoid.stations(coordinates).take(rows)

    def level_distance(self, coordinates: FloatArray, at: IntArray, to: IntArray) -> tuple[FloatArray, FloatArray]:
        """Chord between the verticals at the marks' mean ellipsoidal height; see `Frame.level_distance`."""
        mean = 0.5 * (coordinates[at, 2] + coordinates[to, 2])
        ends = [self.ellipsoid.stations(np.column_stack([coordinates[mark, :2], mean])) for mark in (at, to)]
        chord = ends[1].positions - ends[0].positions
        distance = np.sqrt(np.einsum("ri,ri->r", chord, chord))
        with np.errstate(invalid="ignore"):
            direction = chord / distance[:, None]
        derivatives = np.empty((len(at), 2, 3))
        for role, (mark, end, sign) in enumerate(zip((at, to), ends, (-1.0, 1.0), strict=True)):
            along = sign * np.einsum("rij,rj->ri", end.axes[:, :2], direction)
            derivatives[:, role, :2] = along * end.radii / (end.radii + (coordinates[mark, 2] - mean)[:, None])
        spread = np.einsum("ri,ri->r", ends[1].axes[:, 2] - ends[0].axes[:, 2], direction)
        derivatives[:, :, 2] = 0.5 * spread[:, None]
        return distance, derivatives

    def moved(self, coordinates: FloatArray, corrections: FloatArray) -> FloatArray:
        """Coordinates after a straight step east, north, up; a mark without plan moves in height, one without height
        in plan."""
        stations = self.ellipsoid.stations(_with_heights(coordinates, 0.0))
        steps: FloatArray = np.einsum("rij,ri->rj", stations.axes, np.nan_to_num(corrections))
        result = self.ellipsoid.geodetic(stations.positions + steps)
        no_plan = np.isnan(coordinates[:, :2]).any(axis=1)
        result[no_plan] = coordinates[no_plan]
        result[no_plan, 2] += corrections[no_plan, 2]
        result[np.isnan(coordinates)] = np.nan
        return result

    def displacement(self, start: FloatArray, end: FloatArray) -> FloatArray:
        """Straight step east, north, up at `start` that leads to `end`.

        Where plan is missing only up is known, where a height is missing only east and north; the rest is NaN.
        """
        no_height = np.isnan(start[:, 2]) | np.isnan(end[:, 2])
        level = np.where(no_height[:, None], [1.0, 1.0, 0.0], 1.0)
        stations = self.ellipsoid.stations(_with_heights(start, 0.0) * level)
        steps = self.geocentric(_with_heights(end, 0.0) * level) - stations.positions
        result: FloatArray = np.einsum("rij,rj->ri", stations.axes, steps)
        no_plan = np.isnan(result[:, 0])
        result[:, 2] = np.where(no_plan | no_height, end[:, 2] - start[:, 2], result[:, 2])
        return result

    def grid_rotation(self, coordinates: FloatArray) -> FloatArray:
        """Azimuth (n,) of grid north, radians; 0 for a geographic CRS. NaN where a mark has no plan coordinates."""
        if self._projection is None:
            return np.where(np.isnan(coordinates[:, :2]).any(axis=1), np.nan, 0.0)
        return self._projection.grid_north(coordinates[:, :2], self.ellipsoid)

    def grid_coordinates(self, coordinates: FloatArray) -> FloatArray:
        """Easting and northing (n, 2) in metres, whatever the CRS's unit; NaN for a geographic CRS."""
        if self._projection is None:
            return np.full((len(coordinates), 2), np.nan)
        return self._projection.forward(coordinates[:, :2])

    def geographic(self, coordinates: FloatArray) -> FloatArray:
        """Longitude from Greenwich and latitude (n, 2), radians."""
        return coordinates[:, :2]

    def from_grid(self, grid: FloatArray) -> FloatArray:
        """Longitude and latitude (n, 2), radians, of easting and northing (n, 2) in metres.

        NaN where PROJ finds none, and for a geographic CRS, which has no grid.
        """
        if self._projection is None:
            return np.full((len(grid), 2), np.nan)
        return self._projection.inverse(grid)


def _with_heights(coordinates: FloatArray, height: float) -> FloatArray:
    """Coordinates with `height` in place of missing heights."""
    filled = coordinates.copy()
    filled[np.isnan(filled[:, 2]), 2] = height
    return filled
