"""The instruments of an invented survey party, and the blank rows they fill: what is measured, nothing read yet.

The rows stand in no file before `assemble` puts them into the tables of a job.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.observations import (
    Angles,
    Azimuths,
    Directions,
    HeightDifferences,
    HorizontalDistances,
    Precision,
    Provenance,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)
from adjust.units import ARCSEC


@dataclass(frozen=True)
class Equipment:
    """Standard deviations of an invented party's instruments, radians and metres.

    `distance` + `distance_proportional` · D combine as squares; `centring` is along each horizontal axis, for station
    and target alike, `heights` for measuring an instrument or target height; `level` is for one kilometre of levelling;
    `vector` + `vector_proportional` · D holds east and north, twice that up.
    """

    direction: float = 1.5 * ARCSEC
    azimuth: float = 3.0 * ARCSEC
    zenith: float = 2.0 * ARCSEC
    distance: float = 0.001
    distance_proportional: float = 1.5e-6
    centring: float = 0.0005
    heights: float = 0.0005
    level: float = 0.0007
    vector: float = 0.003
    vector_proportional: float = 0.5e-6

    def _precision(self, rows: int, constant: float, proportional: float = 0.0) -> Precision:
        columns = (np.nan, constant, proportional, self.centring, self.centring, self.heights)
        return Precision(*(np.full(rows, value) for value in columns))

    def directions(self, sights: IntArray) -> Directions:
        """Directions along `sights` (rows, 2), one round at each mark: setups are numbered as their marks."""
        precision = self._precision(len(sights), self.direction)
        return Directions(**_blank(sights), precision=precision, setup_index=sights[:, 0])

    def angles(self, marks: IntArray) -> Angles:
        """Angles at, from, to `marks` (rows, 3)."""
        return Angles(**_blank(marks), precision=self._precision(len(marks), self.direction * np.sqrt(2.0)))

    def azimuths(self, sights: IntArray) -> Azimuths:
        """Azimuths along `sights` (rows, 2)."""
        return Azimuths(**_blank(sights), precision=self._precision(len(sights), self.azimuth))

    def slope_distances(self, sights: IntArray, heights: FloatArray) -> SlopeDistances:
        """Slope distances along `sights` (rows, 2), instrument and target `heights` (rows, 2) in metres."""
        precision = self._precision(len(sights), self.distance, self.distance_proportional)
        return SlopeDistances(**_blank(sights), precision=precision, heights=heights)

    def horizontal_distances(self, sights: IntArray) -> HorizontalDistances:
        """Horizontal distances along `sights` (rows, 2)."""
        precision = self._precision(len(sights), self.distance, self.distance_proportional)
        return HorizontalDistances(**_blank(sights), precision=precision)

    def zenith_angles(self, sights: IntArray, heights: FloatArray) -> ZenithAngles:
        """Zenith angles along `sights` (rows, 2), instrument and target `heights` (rows, 2) in metres."""
        precision = self._precision(len(sights), self.zenith)
        return ZenithAngles(**_blank(sights), precision=precision, heights=heights)

    def height_differences(self, lines: IntArray, lengths: FloatArray) -> HeightDifferences:
        """Levelled rises along `lines` (rows, 2) of `lengths` (rows,) metres."""
        sd = self.level * np.sqrt(lengths / 1000.0)
        return HeightDifferences(**_blank(lines), precision=Precision.of_sd(sd))

    def vectors(
        self, lines: IntArray, lengths: FloatArray, axes: FloatArray, spread: FloatArray | float = 1.0
    ) -> Vectors:
        """GNSS vectors along `lines` (rows, 2) of `lengths` (rows,) metres.

        `axes` (rows, 3, 3) are the unit vectors east, north and up (rows of each matrix) in geocentric axes, in which
        the errors are uncorrelated; geocentric components come out correlated as those of real baselines do. `spread`
        (rows, 3) multiplies the sds east, north and up: good satellites and bad ones.
        """
        sd = spread * (self.vector + self.vector_proportional * lengths)[:, None] * (1.0, 1.0, 2.0)
        covariances = np.einsum("rki,rk,rkj->rij", axes, sd**2, axes)
        return Vectors(**_blank(lines, components=3), covariances=covariances)


def _blank(marks: IntArray, components: int = 1) -> dict[str, Any]:
    rows = len(marks)
    nowhere = Provenance(("",), np.zeros(rows, dtype=np.int64), np.zeros(rows, dtype=np.int64))
    return {"marks": marks, "observed": np.zeros((rows, components)), "provenance": nowhere}
