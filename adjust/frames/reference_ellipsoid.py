"""The reference ellipsoid: radii, local axes, and geodetic ↔ geocentric coordinates, in NumPy alone."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import FloatArray, IntArray

REDUCED_LATITUDE_STEPS = 2
"""Bowring's iteration: one step leaves 1 µm near the Earth's surface and 0.2 m in orbit, two leave only rounding from
1,000 km below the ellipsoid to 40,000 km above it (docs/methods-observations.md)."""


def local_axes(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Unit vectors (n, 3, 3) in geocentric axes: row 0 points east, row 1 north, row 2 up.

    Radians. The matrix turns geocentric differences into east, north, up.
    """
    sin_longitude, cos_longitude = np.sin(longitude), np.cos(longitude)
    sin_latitude, cos_latitude = np.sin(latitude), np.cos(latitude)
    axes = np.empty((len(longitude), 3, 3))
    axes[:, 0, 0], axes[:, 0, 1], axes[:, 0, 2] = -sin_longitude, cos_longitude, 0.0
    axes[:, 1, 0], axes[:, 1, 1], axes[:, 1, 2] = (
        -sin_latitude * cos_longitude,
        -sin_latitude * sin_longitude,
        cos_latitude,
    )
    axes[:, 2, 0], axes[:, 2, 1], axes[:, 2, 2] = (
        cos_latitude * cos_longitude,
        cos_latitude * sin_longitude,
        sin_latitude,
    )
    return axes


@dataclass(frozen=True)
class Stations:
    """Points above the ellipsoid: where they are and how their verticals lean when they move.

    `positions` (n, 3) are geocentric, metres; `axes` (n, 3, 3) as in `local_axes`; `radii` (n, 2) are ν + h and ρ + h,
    the metres east and north that turn the vertical by one radian.
    """

    positions: FloatArray
    axes: FloatArray
    radii: FloatArray

    def take(self, rows: IntArray) -> Stations:
        """The same for a choice of points (rows,), which may repeat."""
        return Stations(*(np.take(column, rows, axis=0) for column in (self.positions, self.axes, self.radii)))


@dataclass(frozen=True)
class ReferenceEllipsoid:
    """An ellipsoid of revolution: `semi_major` in metres, `flattening` f = (a − b)/a (0 for a sphere)."""

    semi_major: float
    flattening: float

    @cached_property
    def semi_minor(self) -> float:
        """b = a (1 − f), metres."""
        return self.semi_major * (1.0 - self.flattening)

    @cached_property
    def eccentricity_squared(self) -> float:
        """e² = f (2 − f)."""
        return self.flattening * (2.0 - self.flattening)

    def prime_vertical_radius(self, latitude: FloatArray) -> FloatArray:
        """ν = a / √(1 − e² sin² φ), metres. ICSM, *GDA2020 Technical Manual*, radii of curvature."""
        return self.semi_major / np.sqrt(1.0 - self.eccentricity_squared * np.sin(latitude) ** 2)

    def meridian_radius(self, latitude: FloatArray) -> FloatArray:
        """ρ = a (1 − e²) / (1 − e² sin² φ)^{3/2}, metres. ICSM, *GDA2020 Technical Manual*, radii of curvature."""
        square = 1.0 - self.eccentricity_squared * np.sin(latitude) ** 2
        return self.semi_major * (1.0 - self.eccentricity_squared) / (square * np.sqrt(square))

    def stations(self, coordinates: FloatArray) -> Stations:
        """Position, axes and radii at longitude, latitude (radians) and ellipsoidal height (n, 3).

        X = (ν + h) cos φ cos λ, Y = (ν + h) cos φ sin λ, Z = (ν (1 − e²) + h) sin φ: ICSM, *GDA2020
        Technical Manual*, geographic to Cartesian conversion.
        """
        longitude, latitude, height = coordinates.T
        axes = local_axes(longitude, latitude)
        prime_vertical = self.prime_vertical_radius(latitude)
        radii = np.column_stack([prime_vertical, self.meridian_radius(latitude)]) + height[:, None]
        positions = axes[:, 2] * radii[:, :1]
        positions[:, 2] -= self.eccentricity_squared * prime_vertical * axes[:, 2, 2]
        return Stations(positions, axes, radii)

    def geocentric(self, coordinates: FloatArray) -> FloatArray:
        """X, Y, Z (n, 3), metres, of longitude, latitude (radians) and ellipsoidal height (n, 3)."""
        return self.stations(coordinates).positions

    def geodetic(self, geocentric: FloatArray) -> FloatArray:
        """Longitude, latitude (radians, −π … π) and height (n, 3) of geocentric X, Y, Z (n, 3), metres.

        Latitude by Bowring (1976), *Survey Review* 23 (181), iterated on the reduced latitude; height by Bowring
        (1985), *Survey Review* 28 (218), which keeps its precision from the equator to the poles (both from memory;
        tested against PROJ).
        """
        x, y, z = geocentric.T
        from_axis = np.hypot(x, y)
        second = self.eccentricity_squared / (1.0 - self.eccentricity_squared) * self.semi_minor
        reduced = np.arctan2(z, (1.0 - self.flattening) * from_axis)
        for _ in range(REDUCED_LATITUDE_STEPS):
            sine, cosine = np.sin(reduced), np.cos(reduced)
            latitude = np.arctan2(
                z + second * sine**3, from_axis - self.eccentricity_squared * self.semi_major * cosine**3
            )
            reduced = np.arctan2((1.0 - self.flattening) * np.sin(latitude), np.cos(latitude))
        sine = np.sin(latitude)
        surface = self.semi_major * np.sqrt(1.0 - self.eccentricity_squared * sine**2)
        height = from_axis * np.cos(latitude) + z * sine - surface
        return np.column_stack([np.arctan2(y, x), latitude, height])
