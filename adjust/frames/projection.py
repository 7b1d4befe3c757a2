"""The map of a coordinate reference system: longitude and latitude ↔ easting and northing, through PROJ."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames.reference_ellipsoid import ReferenceEllipsoid

if TYPE_CHECKING:
    from pyproj import Transformer

GRID_NORTH_STEP = 1e-5
"""Half the step, radians (64 m), of the central difference that finds grid north. Its truncation, some 1e-11 rad, and
PROJ's rounding of 1e-9 m over that step, some 1e-11 rad, are in balance."""
TORN = 1000.0
"""Metres: changes over 64 m ahead and 64 m behind cannot differ so much on a map in one piece."""


@dataclass(frozen=True)
class MapProjection:
    """A projected CRS as eastings and northings in metres of longitudes from Greenwich and latitudes in radians.

    `metre` is the CRS's unit of length in metres, `degree` the unit of its longitudes in radians, `prime_meridian`
    their origin, radians east of Greenwich. `order` and `sign` make eastings and northings of the CRS's own axes.
    """

    transformer: Transformer
    metre: float
    degree: float
    prime_meridian: float
    order: tuple[int, int]
    sign: tuple[int, int]

    def forward(self, longitude_latitude: FloatArray) -> FloatArray:
        """Easting and northing (n, 2), metres, of longitude and latitude (n, 2), radians; NaN where there is none."""
        return self.plane(longitude_latitude)[:, self.order] * (self.metre * np.array(self.sign))

    def plane(self, longitude_latitude: FloatArray) -> FloatArray:
        """The same as x and y (n, 2) in the CRS's own unit and sense, as files in this CRS hold them."""
        longitude, latitude = longitude_latitude.T
        angles = ((longitude - self.prime_meridian) / self.degree, latitude / self.degree)
        return transformed(self.transformer, angles)

    def inverse(self, grid: FloatArray) -> FloatArray:
        """Longitude and latitude (n, 2), radians, of easting and northing (n, 2), metres; NaN where there is none.

        PROJ inverts some maps by a short series: equal-area ones come back a millimetre off. Its forward formulas are
        exact, so that one more inversion, of the map of the first result, removes the error.
        """
        first = self._inverse(grid)
        excess = self._inverse(self.forward(first)) - first
        return first - (excess - 2.0 * np.pi * np.round(excess / (2.0 * np.pi)))

    def _inverse(self, grid: FloatArray) -> FloatArray:
        """As PROJ gives it."""
        plane = np.empty_like(grid)
        plane[:, self.order] = grid * np.array(self.sign) / self.metre
        angles = transformed(self.transformer, (plane[:, 0], plane[:, 1]), "INVERSE") * self.degree
        angles[:, 0] += self.prime_meridian
        return angles

    def grid_north(self, longitude_latitude: FloatArray, ellipsoid: ReferenceEllipsoid) -> FloatArray:
        """Azimuth (n,) on the ellipsoid of the line of constant easting, radians clockwise from the meridian.

        With E_e and E_n the easting's change for a metre east and north on the ground, a step along grid north
        keeps E: its azimuth is atan2(−E_n, E_e). On a conformal map this is the meridian convergence.
        """
        latitude = longitude_latitude[:, 1]
        step = GRID_NORTH_STEP
        by_east = self._easting_change(longitude_latitude, np.array([step, 0.0]))
        by_north = self._easting_change(longitude_latitude, np.array([0.0, step]))
        by_east /= ellipsoid.prime_vertical_radius(latitude) * np.cos(latitude)
        by_north /= ellipsoid.meridian_radius(latitude)
        return np.arctan2(-by_north, by_east)

    def _easting_change(self, longitude_latitude: FloatArray, step: FloatArray) -> FloatArray:
        """Change (n,) of the easting over a step, metres: the mean of one ahead and one behind.

        Where the edge of a map of the whole world runs between them, that of the step which does not cross it.
        """
        before, here, after = (self.forward(longitude_latitude + sign * step)[:, 0] for sign in (-1.0, 0.0, 1.0))
        behind, ahead = here - before, after - here
        shorter = np.where(np.abs(behind) < np.abs(ahead), behind, ahead)
        return np.where(np.abs(ahead - behind) > TORN, shorter, 0.5 * (behind + ahead))


def transformed(transformer: Transformer, columns: tuple[FloatArray, ...], direction: str = "FORWARD") -> FloatArray:
    """PROJ's result (n, columns); a row is NaN where its input is not finite or PROJ has no answer."""
    rows = np.column_stack(columns)
    result = np.full_like(rows, np.nan)
    given = np.isfinite(rows).all(axis=1)
    convert: Any = transformer.transform
    result[given] = np.column_stack(convert(*rows[given].T, direction=direction))
    result[~np.isfinite(result).all(axis=1)] = np.nan
    return result


def read_crs(name: str) -> tuple[ReferenceEllipsoid, MapProjection | None]:
    """The ellipsoid of a CRS, and its map projection unless it is geographic or geocentric.

    Raises ValueError, in words for a surveyor, where PROJ does not know the CRS or it lies on no ellipsoid.
    """
    crs = horizontal_crs(name)
    ellipsoid = crs.ellipsoid
    inverse = ellipsoid.inverse_flattening
    reference = ReferenceEllipsoid(ellipsoid.semi_major_metre, 1.0 / inverse if inverse else 0.0)
    return reference, _projection(crs, name) if crs.is_projected else None


def horizontal_crs(name: str) -> Any:
    """PROJ's two-dimensional CRS of that name, without its vertical part. Raises ValueError as `read_crs` does."""
    return _horizontal(_parse(name), name)


def _parse(name: str) -> Any:
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    try:
        return CRS.from_user_input(name)
    except CRSError as error:
        raise ValueError(
            f"{name!r} is no coordinate reference system that PROJ knows; "
            'give its code, for example "EPSG:25832", or its WKT'
        ) from error


def _horizontal(crs: Any, name: str) -> Any:
    """The two-dimensional part of a compound, bound or three-dimensional CRS."""
    while crs.is_bound or crs.is_compound:
        crs = crs.source_crs if crs.is_bound else crs.sub_crs_list[0]
    rotated = crs.is_geographic and crs.is_derived
    if rotated or not (crs.is_projected or crs.is_geographic or crs.is_geocentric) or crs.ellipsoid is None:
        raise ValueError(
            f"{name!r} is of type {crs.type_name}; the ellipsoid frame needs a projected or geographic CRS"
        )
    return crs if crs.is_geocentric else crs.to_2d()


def _projection(crs: Any, name: str) -> MapProjection:
    from pyproj import Transformer
    from pyproj.exceptions import ProjError

    base = crs.geodetic_crs
    meridian = base.prime_meridian
    order, sign = _east_north(crs.axis_info)
    try:
        transformer = Transformer.from_crs(base.to_2d(), crs, always_xy=True)
    except ProjError as error:
        raise ValueError(f"PROJ knows {name!r} but cannot compute its map projection; choose another CRS") from error
    return MapProjection(
        transformer,
        crs.axis_info[0].unit_conversion_factor,
        base.axis_info[0].unit_conversion_factor,
        meridian.longitude * meridian.unit_conversion_factor,
        order,
        sign,
    )


def _east_north(axes: list[Any]) -> tuple[tuple[int, int], tuple[int, int]]:
    """Which of PROJ's two outputs is the easting and which the northing, and their signs.

    PROJ's x, y order puts east before north, but leaves axes that point west or south as they are. Polar maps, whose
    axes both point north or both south, are in x, y order too.
    """
    directions = [axis.direction for axis in axes[:2]]
    if directions == ["north", "east"]:
        directions.reverse()
    if len({direction in ("east", "west") for direction in directions}) == 1:
        return (0, 1), (1, 1)
    east = next(place for place, direction in enumerate(directions) if direction in ("east", "west"))
    order = (east, 1 - east)
    signs = [-1 if directions[place] in ("west", "south") else 1 for place in order]
    return order, (signs[0], signs[1])
