"""Longitude and latitude on WGS 84, and by which of PROJ's operations they came about."""

from __future__ import annotations

import math
import warnings
from dataclasses import dataclass
from typing import Any

import numpy as np

from adjust.arrays import FloatArray
from adjust.errors import FieldDataError, Mistake
from adjust.frames import EllipsoidFrame
from adjust.frames.projection import transformed
from adjust.reports.exports.places import Places, geographic_crs, in_degrees_of
from adjust.reports.saved import RESULTS

WGS84 = "EPSG:4326"
AXIS_ORDER = "axis order change"
"""How PROJ names the step from latitude, longitude to longitude, latitude."""

PLANE = (
    "this format holds longitudes and latitudes on WGS 84, and a plane frame does not say where on Earth it lies. "
    'Give the job a CRS (kind = "ellipsoid" and crs in job.toml), or export dxf, landxml, gpkg, csv or xlsx'
)


@dataclass(frozen=True)
class ToWgs84:
    """The transformation of the job's geodetic system to WGS 84; `accuracy_m` is None where its authors state none."""

    source: str
    operation: str
    accuracy_m: float | None
    better: tuple[str, ...]
    """Operations that would be more accurate but need a grid that is not installed."""
    _geodetic: Any
    _transformer: Any

    def __call__(self, coordinates: FloatArray) -> FloatArray:
        """Longitude and latitude (n, 2), degrees, of the frame's coordinates (n, 3)."""
        longitude, latitude = in_degrees_of(self._geodetic)(coordinates).T
        return transformed(self._transformer, (longitude, latitude))

    @property
    def sentence(self) -> str:
        """What to bear in mind of the positions."""
        accuracy = "unknown" if self.accuracy_m is None else f"{self.accuracy_m:g} m"
        text = f"{self.source} was transformed to WGS 84 by “{self.operation}”, accuracy {accuracy}"
        if self.better:
            text += f"; {self.better[0]} would be more accurate but needs a grid that PROJ does not find here"
        return f"{text}. The sds are those in the job's own system."


def to_wgs84(places: Places) -> ToWgs84:
    """The best operation PROJ has for the area of the marks. Raises FieldDataError in a plane frame."""
    from pyproj.transformer import TransformerGroup

    if not isinstance(places.frame, EllipsoidFrame):
        raise FieldDataError([Mistake(RESULTS, None, "job.frame", PLANE)])
    geodetic = geographic_crs(places.frame)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UserWarning)  # on missing grids, which `sentence` says itself
        group = TransformerGroup(geodetic, WGS84, always_xy=True, area_of_interest=_area(places))
    best = group.transformers[0]
    better = () if group.best_available else tuple(operation.name for operation in group.unavailable_operations)
    accuracy = best.accuracy if best.accuracy >= 0 and math.isfinite(best.accuracy) else None
    return ToWgs84(geodetic.name, _steps(best.description), accuracy, better, geodetic, best)


def _steps(description: str) -> str:
    """What an operation does, without the exchanges of axes that only concern how PROJ is called."""
    steps = [step for step in description.split(" + ") if not step.startswith(AXIS_ORDER)]
    return " + ".join(steps) or "no change of datum"


def _area(places: Places) -> Any:
    """The marks' bounds, which choose among regional operations; None where no mark has a place."""
    from pyproj.aoi import AreaOfInterest

    degrees = np.degrees(places.coordinates[places.in_plan, :2])
    if not len(degrees):
        return None
    (west, south), (east, north) = degrees.min(axis=0), degrees.max(axis=0)
    return AreaOfInterest(west, south, east, north) if east - west < 180.0 else None
