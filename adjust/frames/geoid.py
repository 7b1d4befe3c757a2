"""Geoid heights from a PROJ vertical grid."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from adjust.arrays import FloatArray


@dataclass(frozen=True)
class GeoidGrid:
    """A vertical grid file that PROJ reads (GTX, GeoTIFF): geoid heights above the ellipsoid."""

    path: Path

    def heights(self, longitude_latitude: FloatArray) -> FloatArray:
        """Geoid heights (n,), metres, at longitudes and latitudes (n, 2), radians; NaN outside the grid."""
        raise NotImplementedError
