"""The ellipsoid frame: longitude, latitude and height on the ellipsoid of any CRS; geometry in geocentric axes."""

from __future__ import annotations

from dataclasses import dataclass, field

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
    ellipsoid: ReferenceEllipsoid = field(init=False, compare=False, repr=False)
    """The CRS's ellipsoid."""
    projection: MapProjection | None = field(init=False, compare=False, repr=False)
    """The CRS's map; None for a geographic CRS."""

    def __post_init__(self) -> None:
        ellipsoid, projection = read_crs(self.crs)
        object.__setattr__(self, "ellipsoid", ellipsoid)
        object.__setattr__(self, "projection", projection)

    @property
    def is_geographic(self) -> bool:
        """Whether the CRS has no map projection, hence no grid."""
        return self.projection is None

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
        with np.errstate(divide="ignore", invalid="ignore"):
            direction = chord / distance[:, None]
        derivatives = np.empty((len(at), 2, 3))
        for role, (mark, end, sign) in enumerate(zip((at, to), ends, (-1.0, 1.0), strict=True)):
            along = sign * np.einsum("rij,rj->ri", end.axes[:, :2], direction)
            derivatives[:, role, :2] = along * end.radii / (end.radii + (coordinates[mark, 2] - mean)[:, None])
        spread = np.einsum("ri,ri->r", ends[1].axes[:, 2] - ends[0].axes[:, 2], direction)
        derivatives[:, :, 2] = 0.5 * spread[:, None]
        return distance, derivatives

    def moved(self, coordinates: FloatArray, corrections: FloatArray) -> FloatArray:
        """Coordinates after a straight step east, north, up.

        A mark without plan moves in height alone, a mark without height in plan alone.
        """
        stations = self.ellipsoid.stations(_on_ellipsoid_where_no_height(coordinates))
        steps: FloatArray = np.einsum("rij,ri->rj", stations.axes, np.nan_to_num(corrections))
        result = self.ellipsoid.geodetic(stations.positions + steps)
        no_plan = np.isnan(coordinates[:, :2]).any(axis=1)
        result[no_plan] = coordinates[no_plan] + corrections[no_plan]
        result[np.isnan(coordinates)] = np.nan
        return result

    def displacement(self, start: FloatArray, end: FloatArray) -> FloatArray:
        """Straight step east, north, up at `start` that leads to `end`.

        Where plan is missing only up is known, where a height is missing only east and north; the rest is NaN.
        """
        no_height = np.isnan(start[:, 2]) | np.isnan(end[:, 2])
        start_heights, end_heights = (np.where(no_height, 0.0, ends[:, 2]) for ends in (start, end))
        stations = self.ellipsoid.stations(np.column_stack([start[:, :2], start_heights]))
        steps = self.geocentric(np.column_stack([end[:, :2], end_heights])) - stations.positions
        result: FloatArray = np.einsum("rij,rj->ri", stations.axes, steps)
        no_plan = np.isnan(result[:, 0])
        result[:, 2] = np.where(no_plan | no_height, end[:, 2] - start[:, 2], result[:, 2])
        return result

    def grid_rotation(self, coordinates: FloatArray) -> FloatArray:
        """Azimuth (n,) of grid north, radians; 0 for a geographic CRS. NaN where a mark has no plan coordinates."""
        if self.projection is None:
            return np.where(np.isnan(coordinates[:, :2]).any(axis=1), np.nan, 0.0)
        return self.projection.grid_north(coordinates[:, :2], self.ellipsoid)

    def grid_coordinates(self, coordinates: FloatArray) -> FloatArray:
        """Easting and northing (n, 2) in metres, whatever the CRS's unit; NaN for a geographic CRS."""
        if self.projection is None:
            return np.full((len(coordinates), 2), np.nan)
        return self.projection.forward(coordinates[:, :2])

    def geographic(self, coordinates: FloatArray) -> FloatArray:
        """Longitude from Greenwich and latitude (n, 2), radians."""
        return coordinates[:, :2]

    def from_grid(self, grid: FloatArray) -> FloatArray:
        """Longitude and latitude (n, 2), radians, of easting and northing (n, 2) in metres.

        NaN where PROJ finds none, and for a geographic CRS, which has no grid.
        """
        if self.projection is None:
            return np.full((len(grid), 2), np.nan)
        return self.projection.inverse(grid)


def _on_ellipsoid_where_no_height(coordinates: FloatArray) -> FloatArray:
    """Coordinates whose missing heights are zero."""
    return np.column_stack([coordinates[:, :2], np.nan_to_num(coordinates[:, 2])])
