"""From a straight slope distance to the ellipsoid, with the radius of the section it lies in."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames.reference_ellipsoid import ReferenceEllipsoid


def radius_in_azimuth(ellipsoid: ReferenceEllipsoid, latitude: FloatArray, azimuth: FloatArray) -> FloatArray:
    """Radius (rows,) of the normal section in an azimuth, metres: ρν / (ν cos²α + ρ sin²α), Euler's theorem.

    `latitude` and `azimuth` (rows,) radians. ICSM (2009), *Geocentric Datum of Australia Technical Manual* 2.3,
    chapter on reduction of measured distances.
    """
    meridian, prime_vertical = ellipsoid.meridian_radius(latitude), ellipsoid.prime_vertical_radius(latitude)
    radius: FloatArray = (
        meridian * prime_vertical / (prime_vertical * np.cos(azimuth) ** 2 + meridian * np.sin(azimuth) ** 2)
    )
    return radius


def ellipsoid_distance(
    slope: FloatArray, start_height: FloatArray, end_height: FloatArray, radius: FloatArray
) -> FloatArray:
    """Distances along the ellipsoid (rows,), metres, of straight ones (rows,) between points at ellipsoidal heights.

    Chord √((d² − Δh²) / ((1 + h₁/R)(1 + h₂/R))), then arc 2R asin(chord/2R), R the `radius` (rows,) of the section.
    ICSM (2009), same chapter.
    """
    level = slope**2 - (end_height - start_height) ** 2
    chord = np.sqrt(level / ((1.0 + start_height / radius) * (1.0 + end_height / radius)))
    return 2.0 * radius * np.arcsin(chord / (2.0 * radius))
