"""Height differences by spirit levelling."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import Geometry
from adjust.observations.base import Observations, Precision


@dataclass(frozen=True, kw_only=True)
class HeightDifferences(Observations):
    """Levelled rises, metres: the height of `to` minus the height of `from`, above the geoid."""

    kind = "height_difference"
    table = "levels"
    roles = ("from", "to")
    unit = "m"
    determines_plan = False
    determines_height = True

    precision: Precision
    """`constant` is the sd of the whole line; nothing is centred."""
    length: FloatArray = field(default_factory=lambda: np.empty(0))
    """Lengths (rows,) of the levelled lines, metres, by which closures are judged; NaN where none is stated, as in all
    rows when it is left out."""

    def __post_init__(self) -> None:
        if len(self.length) != len(self):
            object.__setattr__(self, "length", np.full(len(self), np.nan))

    def predict(self, geometry: Geometry) -> FloatArray:
        """Difference (rows, 1) of levelled heights; in an ellipsoid frame Δh − Δ(geoid height)."""
        heights = geometry.levelled_heights
        return (heights[self.marks[:, 1]] - heights[self.marks[:, 0]])[:, None]

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """−1 by the height of `from`, +1 by that of `to`: (rows, 1, 2, 3). The geoid's slope is left out: the height
        is taken again at each iteration's position."""
        derivatives = np.zeros((len(self), 1, 2, 3))
        derivatives[:, 0, :, 2] = (-1.0, 1.0)
        return derivatives

    def covariance(self, geometry: Geometry) -> FloatArray:
        """Variance (rows, 1, 1) of the line."""
        stated = self.precision.stated
        return np.where(np.isnan(stated), self.precision.constant, stated)[:, None, None] ** 2
