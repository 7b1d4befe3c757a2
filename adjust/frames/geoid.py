"""Geoid heights from a PROJ vertical grid."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames.projection import transformed

if TYPE_CHECKING:
    from pyproj import Transformer


@dataclass(frozen=True)
class GeoidGrid:
    """A vertical grid file that PROJ reads (GTX, GeoTIFF): geoid heights above the ellipsoid."""

    path: Path

    def heights(self, longitude_latitude: FloatArray) -> FloatArray:
        """Geoid heights (n,), metres, at longitudes and latitudes (n, 2), radians; NaN outside the grid.

        Raises ValueError, in words, where the file is missing or is no vertical grid.
        """
        longitude, latitude = np.degrees(longitude_latitude.T)
        return transformed(self._shift, (longitude, latitude, np.zeros_like(longitude)))[:, 2]

    @cached_property
    def _shift(self) -> Transformer:
        """The PROJ operation that adds the geoid height to a height of zero. It reads the file, never the network."""
        from pyproj import Transformer
        from pyproj.exceptions import ProjError

        path = self.path.resolve()  # PROJ would look for a bare name among its own grids
        if not path.is_file():
            raise ValueError(f"there is no geoid grid {path}; put the file in the job folder or mend its name")
        if any(character in str(path) for character in ',"'):
            raise ValueError(f"PROJ cannot read a path with a comma or a quotation mark: {path}; rename the file")
        steps = ["+proj=unitconvert +xy_in=deg +xy_out=rad", f'+proj=vgridshift +grids="{path}" +multiplier=1']
        try:
            return Transformer.from_pipeline("+proj=pipeline " + " ".join(f"+step {step}" for step in steps))
        except ProjError as error:
            raise ValueError(f"{path} is no vertical grid that PROJ can read; give a GTX or GeoTIFF file") from error
