"""The plane in which start coordinates are found.

Points are complex numbers, northing + i · easting, so that the argument of a difference is its azimuth, clockwise from
north. In a plane frame they are the frame's own; in an ellipsoid frame a transverse Mercator map centred on the marks
with given coordinates and scaled to their mean height, on which angles and, over tens of kilometres, distances hold.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from adjust.arrays import FloatArray, IntArray
from adjust.errors import NetworkError
from adjust.frames import EllipsoidFrame, Frame
from adjust.frames.reference_ellipsoid import local_axes
from adjust.job import Job

ComplexArray = NDArray[np.complex128]


class WorkingPlane(ABC):
    """Where the marks lie while a start is sought: points (n,), complex, metres; NaN where there is none."""

    @abstractmethod
    def points(self, coordinates: FloatArray) -> ComplexArray:
        """Points (n,) of the frame's coordinates (n, 3)."""

    @abstractmethod
    def plan(self, points: ComplexArray) -> FloatArray:
        """The frame's plan coordinates (n, 2) of points (n,)."""

    @abstractmethod
    def north(self, points: ComplexArray) -> FloatArray:
        """Azimuth (n,) of the working plane's north, radians clockwise from the frame's north; 0 where not known."""

    @abstractmethod
    def reduced_vectors(
        self, observed: FloatArray, marks: IntArray, points: ComplexArray, heights: FloatArray
    ) -> tuple[ComplexArray, FloatArray]:
        """Geocentric vectors (rows, 3) between `marks` (rows, 2) as differences (rows,) of points and of heights.

        `points` and ellipsoidal `heights` (n,) are where the marks are thought to lie, NaN where nothing is known yet.
        """


@dataclass(frozen=True)
class GridPlane(WorkingPlane):
    """The plane frame itself."""

    def points(self, coordinates: FloatArray) -> ComplexArray:
        """Northing + i · easting."""
        return coordinates[:, 1] + 1j * coordinates[:, 0]

    def plan(self, points: ComplexArray) -> FloatArray:
        """Easting and northing."""
        return np.column_stack([points.imag, points.real])

    def north(self, points: ComplexArray) -> FloatArray:
        """The frame's north is the plane's."""
        return np.zeros(len(points))

    def reduced_vectors(
        self, observed: FloatArray, marks: IntArray, points: ComplexArray, heights: FloatArray
    ) -> tuple[ComplexArray, FloatArray]:
        """Raises NetworkError where there are vectors: they are geocentric."""
        if len(observed):
            raise NetworkError('GNSS vectors need an ellipsoid frame: give [frame] kind = "ellipsoid" and a crs')
        return np.empty(0, dtype=complex), np.empty(0)


@dataclass(frozen=True)
class LocalMap(WorkingPlane):
    """A transverse Mercator map about `centre` (longitude, latitude in radians, ellipsoidal height in metres)."""

    frame: EllipsoidFrame
    centre: tuple[float, float, float]

    def points(self, coordinates: FloatArray) -> ComplexArray:
        """Northing + i · easting on the map."""
        easting, northing = self._projection(*coordinates[:, :2].T, radians=True)
        return np.where(np.isnan(coordinates[:, 0]), np.nan, northing + 1j * easting)

    def plan(self, points: ComplexArray) -> FloatArray:
        """Longitude and latitude, radians."""
        longitude, latitude = self._projection(points.imag, points.real, inverse=True, radians=True)
        return np.where(np.isnan(points)[:, None], np.nan, np.column_stack([longitude, latitude]))

    def north(self, points: ComplexArray) -> FloatArray:
        """Meridian convergence of the map, by PROJ."""
        known = ~np.isnan(points)
        result = np.zeros(len(points))
        longitude, latitude = self.plan(points[known]).T
        result[known] = np.radians(self._projection.get_factors(longitude, latitude, radians=True).meridian_convergence)
        return result

    def reduced_vectors(
        self, observed: FloatArray, marks: IntArray, points: ComplexArray, heights: FloatArray
    ) -> tuple[ComplexArray, FloatArray]:
        """The vector set off from where its first end is thought to lie, else from its last end, else the centre."""
        coordinates = np.column_stack([self.plan(points), heights])
        coordinates[:, 2] = np.where(np.isnan(heights), self.centre[2], heights)
        start, end = coordinates[marks[:, 0]], coordinates[marks[:, 1]]
        backwards = np.isnan(start[:, 0]) & ~np.isnan(end[:, 0])
        known = np.where(backwards[:, None], end, start)
        known[np.isnan(known[:, 0])] = self.centre
        sign = np.where(backwards, -1.0, 1.0)
        reached = self.frame.from_geocentric(self.frame.geocentric(known) + sign[:, None] * observed)
        return sign * (self.points(reached) - self.points(known)), sign * (reached[:, 2] - known[:, 2])

    @cached_property
    def _projection(self) -> Any:
        from pyproj import Proj

        ellipsoid, (longitude, latitude, height) = self.frame.ellipsoid, self.centre
        scale = 1.0 + height / ellipsoid.semi_major
        return Proj(
            proj="tmerc",
            lon_0=np.degrees(longitude),
            lat_0=np.degrees(latitude),
            k_0=scale,
            a=ellipsoid.semi_major,
            b=ellipsoid.semi_minor,
        )


def working_plane(job: Job) -> WorkingPlane:
    """The working plane of a job. Raises NetworkError where an ellipsoid frame has no mark with plan coordinates."""
    if not isinstance(job.frame, EllipsoidFrame):
        return GridPlane()
    return LocalMap(job.frame, _centre(job, job.frame))


def _centre(job: Job, frame: Frame) -> tuple[float, float, float]:
    """The middle of the marks with given plan coordinates, at their mean height, 0 where none is given."""
    given = job.marks.given[~np.isnan(job.marks.given[:, :2]).any(axis=1)]
    if not len(given):
        raise NetworkError(
            "no mark has plan coordinates, so nothing says where on the ellipsoid the network lies: "
            "give latitude and longitude, or easting and northing, for at least one mark"
        )
    up = local_axes(given[:, 0], given[:, 1])[:, 2].sum(axis=0)
    heights = given[~np.isnan(given[:, 2]), 2]
    height = float(heights.mean()) if len(heights) else 0.0
    return float(np.arctan2(up[1], up[0])), float(np.arctan2(up[2], np.hypot(up[0], up[1]))), height
