"""The grid sheet: what a map projection does at every mark and along every line."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.frames.ellipsoid import EllipsoidFrame
from adjust.observations.base import Columns
from adjust.reductions.ellipsoid_distance import ellipsoid_distance, radius_in_azimuth

if TYPE_CHECKING:
    from pyproj import Geod

STEP = 50.0
"""Half the step, metres, of central differences on the map. PROJ rounds to about 1e-9 m, hence 2e-11 of a scale factor
and 4e-6″ of a bearing; what the step leaves out, of the order (step/R)², is as small."""


@dataclass(frozen=True)
class MarkFactors(Columns):
    """The map at each mark; arrays (marks,), NaN where a mark has no plan position.

    `grid` (marks, 2) is easting and northing. `point_scale` is grid over ellipsoid length; on a map that is not
    conformal the root of its areal scale, and `largest_shear` says by how much the scale differs with direction
    (largest over smallest − 1). `convergence` is the azimuth of grid north, radians, positive where grid north lies
    east of true north, so that grid bearing = azimuth − convergence. `height_factor` is ellipsoid over ground length
    at the mark's ellipsoidal height, `combined` their product.
    """

    grid: FloatArray
    point_scale: FloatArray
    largest_shear: FloatArray
    convergence: FloatArray
    height_factor: FloatArray
    combined: FloatArray


@dataclass(frozen=True)
class LineFactors(Columns):
    """Lines on the ground, the ellipsoid and the grid; arrays (lines,), metres and radians.

    `ground` is the level distance at the marks' mean height, `ellipsoid` the geodesic, `grid` the straight line on the
    map; `line_scale` is grid over ellipsoid, `height_factor` ellipsoid over ground, `combined` grid over ground.
    `azimuth` is the geodesic's at the first mark, `grid_bearing` that of its image on the map, `plane_bearing` that of
    the straight line; `arc_to_chord` = plane − grid bearing, there and (`arc_to_chord_back`) at the other mark.
    """

    marks: IntArray
    ground: FloatArray
    ellipsoid: FloatArray
    grid: FloatArray
    line_scale: FloatArray
    height_factor: FloatArray
    combined: FloatArray
    azimuth: FloatArray
    grid_bearing: FloatArray
    plane_bearing: FloatArray
    arc_to_chord: FloatArray
    arc_to_chord_back: FloatArray


def mark_factors(frame: EllipsoidFrame, coordinates: FloatArray) -> MarkFactors:
    """Factors at longitudes, latitudes (radians) and ellipsoidal heights (marks, 3), by differencing the map itself.

    Any projection will do. The height factor is R/(R + h) with the mean radius R = √(ρν): Stem (1989), *State Plane
    Coordinate System of 1983*, NOAA Manual NOS NGS 5, section 4.2 (number from
    memory).
    """
    scale, shear, convergence = _distortion(frame, coordinates)
    meridian, prime_vertical = (
        radius(coordinates[:, 1]) for radius in (frame.ellipsoid.meridian_radius, frame.ellipsoid.prime_vertical_radius)
    )
    radius = np.sqrt(meridian * prime_vertical)
    height_factor = radius / (radius + coordinates[:, 2])
    return MarkFactors(
        frame.grid_coordinates(coordinates), scale, shear, convergence, height_factor, scale * height_factor
    )


def _distortion(frame: EllipsoidFrame, coordinates: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Scale, shear and convergence (marks,) from the map's derivatives by metres east and north on the ellipsoid."""
    latitude = coordinates[:, 1]
    east = STEP / (frame.ellipsoid.prime_vertical_radius(latitude) * np.cos(latitude))
    north = STEP / frame.ellipsoid.meridian_radius(latitude)
    nothing = np.zeros_like(east)
    derivatives = np.empty((len(coordinates), 2, 2))
    for column, step in enumerate((np.column_stack([east, nothing]), np.column_stack([nothing, north]))):
        ends = [_on_map(frame, coordinates[:, :2] + sign * step) for sign in (1.0, -1.0)]
        derivatives[:, :, column] = (ends[0] - ends[1]) / (2.0 * STEP)
    by_east, by_north = derivatives[:, 0].T
    determinant = np.abs(derivatives[:, 0, 0] * derivatives[:, 1, 1] - derivatives[:, 0, 1] * derivatives[:, 1, 0])
    squares = np.sum(derivatives**2, axis=(1, 2))
    difference = np.sqrt(np.maximum(squares**2 - 4.0 * determinant**2, 0.0))
    shear = np.sqrt((squares + difference) / (squares - difference)) - 1.0
    return np.sqrt(determinant), shear, np.arctan2(-by_north, by_east)


def _on_map(frame: EllipsoidFrame, plan: FloatArray) -> FloatArray:
    return frame.grid_coordinates(np.column_stack([plan, np.zeros(len(plan))]))


def line_factors(frame: EllipsoidFrame, coordinates: FloatArray, marks: IntArray) -> LineFactors:
    """Lengths and bearings of the lines between `marks` (lines, 2), `coordinates` (marks, 3) as in `mark_factors`.

    Every figure comes from geometry, not from a series of one projection: geodesics by Karney (2013), *Journal of
    Geodesy* 87, through PROJ; the bearing of a geodesic's image from two points of it on either side of the mark.
    """
    from pyproj import Geod

    ellipsoid = frame.ellipsoid
    geodesic = Geod(a=ellipsoid.semi_major, f=ellipsoid.flattening)
    start, end = (coordinates[marks[:, role]] for role in (0, 1))
    azimuth, back, length = geodesic.inv(start[:, 0], start[:, 1], end[:, 0], end[:, 1], radians=True)
    chord = _on_map(frame, end[:, :2]) - _on_map(frame, start[:, :2])
    grid = np.hypot(*chord.T)
    plane_bearing = np.arctan2(*chord.T)
    grid_bearing = _bearing_on_map(frame, geodesic, start, azimuth)
    back_bearing = _bearing_on_map(frame, geodesic, end, back)
    ground, _ = frame.level_distance(coordinates, marks[:, 0], marks[:, 1])
    with np.errstate(invalid="ignore"):
        return LineFactors(
            marks,
            ground,
            length,
            grid,
            grid / length,
            length / ground,
            grid / ground,
            np.remainder(azimuth, FULL_TURN),
            np.remainder(grid_bearing, FULL_TURN),
            np.remainder(plane_bearing, FULL_TURN),
            wrapped(plane_bearing - grid_bearing),
            wrapped(plane_bearing + np.pi - back_bearing),
        )


def measured_on_ellipsoid(
    frame: EllipsoidFrame, coordinates: FloatArray, marks: IntArray, slope: FloatArray, heights: FloatArray
) -> FloatArray:
    """Measured slope distances (rows,) between `marks` (rows, 2), reduced to the ellipsoid, metres.

    `heights` (rows, 2) are those of instrument and target above the marks. See `ellipsoid_distance`; the radius is that
    of the section at the line's middle.
    """
    from pyproj import Geod

    geodesic = Geod(a=frame.ellipsoid.semi_major, f=frame.ellipsoid.flattening)
    start, end = (coordinates[marks[:, role]] for role in (0, 1))
    azimuth, back, _ = geodesic.inv(start[:, 0], start[:, 1], end[:, 0], end[:, 1], radians=True)
    at_middle = azimuth + wrapped(np.asarray(back) + np.pi - azimuth) / 2.0
    radius = radius_in_azimuth(frame.ellipsoid, (start[:, 1] + end[:, 1]) / 2.0, at_middle)
    return ellipsoid_distance(slope, start[:, 2] + heights[:, 0], end[:, 2] + heights[:, 1], radius)


def _bearing_on_map(frame: EllipsoidFrame, geodesic: Geod, points: FloatArray, azimuth: FloatArray) -> FloatArray:
    """Bearing (points,) on the map of the geodesic that leaves each point in an azimuth, radians."""
    ends = []
    for turn in (0.0, np.pi):
        step = np.full(len(points), STEP)
        longitude, latitude, _ = geodesic.fwd(points[:, 0], points[:, 1], azimuth + turn, step, radians=True)
        ends.append(_on_map(frame, np.column_stack([longitude, latitude])))
    bearing: FloatArray = np.arctan2(*(ends[0] - ends[1]).T)
    return bearing
