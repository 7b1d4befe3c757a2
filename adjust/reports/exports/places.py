"""Where saved marks stand, and the outlines of their ellipses, in any of the systems a file may ask for."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.errors import FieldDataError, Mistake
from adjust.frames import EllipsoidFrame, Frame, PlaneFrame
from adjust.frames.projection import horizontal_crs
from adjust.reports.saved import RESULTS, EllipseRecord, MarkRecord, SavedResults

Target = Callable[[FloatArray], FloatArray]
"""From coordinates of the frame (n, 3) to x and y (n, 2) of a file."""

CORNERS = 72
"""Of an outline: it keeps within 0.1 % of the ellipse, 1 − cos(π / 72)."""

THINNEST = 1e-6
"""Least ratio of axes that is drawn: an ellipse without any width is no area, and drawings hold none thinner."""

METRES = 1e-3
"""In a millimetre."""


@dataclass(frozen=True)
class Places:
    """The marks of some results in their frame, in the order of the results."""

    frame: Frame
    marks: Sequence[MarkRecord]

    @cached_property
    def coordinates(self) -> FloatArray:
        """(n, 3): E, N, H; or longitude, latitude (radians), height above the ellipsoid. NaN where there is none."""
        if self.frame.kind == "plane":
            return figures([(mark.easting_m, mark.northing_m, mark.height_m) for mark in self.marks])
        degrees = figures([(mark.longitude_deg, mark.latitude_deg) for mark in self.marks])
        heights = figures([(mark.ellipsoidal_height_m,) for mark in self.marks])
        return np.hstack([np.radians(degrees), heights])

    @cached_property
    def index(self) -> dict[str, int]:
        """Row of each mark by its name."""
        return {mark.mark: row for row, mark in enumerate(self.marks)}

    @cached_property
    def in_plan(self) -> BoolArray:
        """Whether a mark (n,) has plan coordinates."""
        return np.asarray(np.isfinite(self.coordinates[:, :2]).all(axis=1))

    def outlines(self, rows: IntArray, ellipses: Sequence[EllipseRecord], exaggeration: float) -> FloatArray:
        """Corners (rows, CORNERS, 3) of the ellipses about the marks `rows`, anticlockwise, in the frame's coordinates.

        They are laid out in metres on the ground from the axes of the grid, so that a map's own scale does not deform
        what they say.
        """
        offsets = _offsets(ellipses, exaggeration)
        turn = self.frame.grid_rotation(self.coordinates[rows])
        east, north = offsets[..., 0], offsets[..., 1]
        cosine, sine = np.cos(turn)[:, None], np.sin(turn)[:, None]
        steps = np.stack([east * cosine + north * sine, north * cosine - east * sine, np.zeros_like(east)], axis=2)
        centres = np.repeat(self.coordinates[rows], CORNERS, axis=0)
        return self.frame.moved(centres, steps.reshape(-1, 3)).reshape(len(rows), CORNERS, 3)


def _offsets(ellipses: Sequence[EllipseRecord], exaggeration: float) -> FloatArray:
    """Corners (n, CORNERS, 2) east and north of the centres, metres."""
    axes = figures([(ellipse.semi_major_mm, ellipse.semi_minor_mm, ellipse.azimuth_deg) for ellipse in ellipses])
    major = axes[:, 0] * METRES * exaggeration
    minor = np.maximum(axes[:, 1] * METRES * exaggeration, THINNEST * major)
    azimuth = np.radians(axes[:, 2])[:, None]
    around = np.linspace(0.0, -2.0 * np.pi, CORNERS, endpoint=False)
    along, across = major[:, None] * np.cos(around), minor[:, None] * np.sin(around)
    east = along * np.sin(azimuth) + across * np.cos(azimuth)
    north = along * np.cos(azimuth) - across * np.sin(azimuth)
    return np.stack([east, north], axis=2)


def figures(rows: Sequence[tuple[float | None, ...]]) -> FloatArray:
    """Numbers (n, columns), NaN for None."""
    return np.array(rows, dtype=float)


def places_of(results: SavedResults) -> Places:
    """The marks of results in the frame that the results name. Raises FieldDataError for a CRS that PROJ rejects."""
    if results.job.frame == "plane":
        return Places(PlaneFrame(), results.marks)
    try:
        return Places(EllipsoidFrame(results.job.crs or ""), results.marks)
    except ValueError as error:
        raise FieldDataError([Mistake(RESULTS, None, "job.crs", str(error))]) from error


def in_own_crs(frame: Frame) -> Target:
    """x and y as files in the frame's own CRS hold them: in its unit, east before north; metres in a plane frame."""
    if not isinstance(frame, EllipsoidFrame):
        return frame.grid_coordinates
    projection = frame.projection
    if projection is not None:
        return lambda coordinates: projection.plane(coordinates[:, :2])
    return in_degrees_of(geographic_crs(frame))


def in_degrees_of(geodetic: Any) -> Target:
    """Longitude and latitude in the unit and from the prime meridian of a geodetic CRS of PROJ."""
    meridian = geodetic.prime_meridian
    origin = np.array([meridian.longitude * meridian.unit_conversion_factor, 0.0])
    unit = geodetic.axis_info[0].unit_conversion_factor
    return lambda coordinates: (coordinates[:, :2] - origin) / unit


def map_crs(frame: EllipsoidFrame) -> Any:
    """PROJ's two-dimensional CRS that `in_own_crs` gives x and y of: the projected one, or else the geographic one."""
    return geographic_crs(frame) if frame.is_geographic else horizontal_crs(frame.crs)


def geographic_crs(frame: EllipsoidFrame) -> Any:
    """PROJ's geographic CRS that the frame's longitudes and latitudes are on."""
    from pyproj.crs import GeographicCRS

    crs = horizontal_crs(frame.crs)
    return GeographicCRS(name=crs.name, datum=crs.datum) if crs.is_geocentric else crs.geodetic_crs.to_2d()
