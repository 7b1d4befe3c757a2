"""Error ellipses from the covariance of two coordinates."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from adjust.arrays import FloatArray


class Ellipse(NamedTuple):
    """One ellipse or many: semi-axes in the unit of the coordinates, azimuth of the major axis in radians.

    The azimuth runs clockwise from north, 0 ≤ azimuth < π.
    """

    semi_major: FloatArray
    semi_minor: FloatArray
    azimuth: FloatArray

    def scaled(self, factor: float) -> Ellipse:
        """The same ellipse with semi-axes `factor` times as long.

        With an unknown factor (NaN) nothing of it exists, but a point stays a point.
        """
        major, minor = (np.where(axis == 0.0, 0.0, axis * factor)[()] for axis in self[:2])
        return Ellipse(major, minor, np.where(np.isnan(major), np.nan, self.azimuth)[()])


def standard_ellipse(covariance: FloatArray) -> Ellipse:
    """Standard (1σ) ellipses of covariances (…, 2, 2) in the order east, north; arrays (…,) come back.

    a² = (s_E² + s_N²)/2 + √(((s_N² − s_E²)/2)² + s_EN²), azimuth = ½ atan2(2 s_EN, s_N² − s_E²).
    The minor axis comes from the determinant, b = √det / a: the difference of mean and root would lose every digit
    of a long thin ellipse. Of a circle the azimuth is 0. NaN stays NaN. The azimuth of the difference of two marks
    comes from the covariance of that difference.
    Source: the eigenvalues of the covariance; Mikhail and Gracie (1981), Analysis and adjustment of survey
    measurements, chapter on error ellipses (from memory).
    """
    east, north, cross = covariance[..., 0, 0], covariance[..., 1, 1], covariance[..., 0, 1]
    major_square = (east + north) / 2 + np.hypot((north - east) / 2, cross)
    semi_major = np.sqrt(major_square)
    both = np.sqrt(east * north)
    determinant = np.maximum((both - np.abs(cross)) * (both + np.abs(cross)), 0)
    point = major_square == 0
    semi_minor = np.where(point, 0, np.sqrt(determinant) / np.where(point, 1, semi_major))
    azimuth = np.arctan2(2 * cross, north - east) / 2 % np.pi
    return Ellipse(semi_major, np.minimum(semi_minor, semi_major), np.where(azimuth >= np.pi, 0, azimuth)[()])
