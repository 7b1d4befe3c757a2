"""Slope distances and zenith angles, reduced to horizontal distances and height differences as far as they can be."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import PlaneFrame
from adjust.job import Job
from adjust.network.consensus import group_medians
from adjust.network.estimate import Estimate
from adjust.observations import HorizontalDistances, SlopeDistances, ZenithAngles
from adjust.observations.zenith import EARTH_RADIUS


@dataclass(frozen=True)
class HorizontalLines:
    """Horizontal distances (rows,) between `marks` (rows, 2), metres."""

    marks: IntArray
    length: FloatArray


@dataclass(frozen=True)
class Rises:
    """Height differences (rows,) between `marks` (rows, 2): second minus first, metres."""

    marks: IntArray
    rise: FloatArray


class PairTable:
    """One median value for each pair of marks, found by its pair."""

    def __init__(self, marks: IntArray, values: FloatArray, count: int) -> None:
        self.count = count
        known = ~np.isnan(values)
        self.keys, self.values = group_medians(self._key(marks[known]), values[known])

    def _key(self, marks: IntArray) -> IntArray:
        key: IntArray = marks[:, 0] * self.count + marks[:, 1]
        return key

    def of(self, marks: IntArray) -> FloatArray:
        """Values (rows,) for pairs (rows, 2) in their order; NaN where there is none."""
        if not len(self.keys):
            return np.full(len(marks), np.nan)
        key = self._key(marks)
        place = np.minimum(np.searchsorted(self.keys, key), len(self.keys) - 1)
        return np.where(self.keys[place] == key, self.values[place], np.nan)


class SightLines:
    """The slopes and zenith angles of a job, matched line by line."""

    def __init__(self, job: Job) -> None:
        self.count = len(job.marks)
        self.slopes = [rows for rows in job.observations if isinstance(rows, SlopeDistances)]
        self.zeniths = [rows for rows in job.observations if isinstance(rows, ZenithAngles)]
        self.horizontals = [rows for rows in job.observations if isinstance(rows, HorizontalDistances)]
        curved = not isinstance(job.frame, PlaneFrame) or job.frame.earth_curvature
        self.fall = (1.0 - job.refraction_coefficient) / (2.0 * EARTH_RADIUS) if curved else 0.0
        marks, zenith = _columns(self.zeniths)
        both_ways = np.vstack([marks, marks[:, ::-1]])
        self.zenith_of = PairTable(both_ways, np.concatenate([zenith, np.pi - zenith]), self.count)

    def horizontal(self, estimate: Estimate) -> HorizontalLines:
        """Every distance, reduced by its zenith angle, else by the heights known so far, else left as it is.

        A reverse zenith angle serves as well as a forward one: they differ by minutes of arc, of little weight in
        a start.
        """
        marks, length = _columns(self.horizontals)
        slope_marks, slope = _columns(self.slopes)
        heights = np.vstack([rows.heights for rows in self.slopes]) if self.slopes else np.empty((0, 2))
        zenith = self.zenith_of.of(slope_marks)
        ends = estimate.spatial_heights[slope_marks] + heights
        rise = np.nan_to_num(ends[:, 1] - ends[:, 0])
        by_heights = np.sqrt(np.where(np.abs(rise) < slope, slope**2 - rise**2, slope**2))
        reduced = np.where(np.isnan(zenith), by_heights, slope * np.sin(np.nan_to_num(zenith)))
        return HorizontalLines(np.vstack([marks, slope_marks]), np.concatenate([length, reduced]))

    def rises(self, estimate: Estimate) -> Rises:
        """Trigonometric height differences of the zenith angles whose distance is measured or known by now.

        H_to − H_at = S cos z + (1 − k) s²/2R + instrument height − target height, with s cot z for S cos z where no
        slope distance is measured: what a zenith angle is predicted to be, solved for the height difference.
        """
        if not self.zeniths:
            return Rises(np.empty((0, 2), dtype=np.int64), np.empty(0))
        marks, zenith = _columns(self.zeniths)
        heights = np.vstack([rows.heights for rows in self.zeniths])
        slope = self._measured(self.slopes, marks)
        level = self._measured(self.horizontals, marks)
        apart = np.abs(estimate.points[marks[:, 1]] - estimate.points[marks[:, 0]])
        level = np.where(np.isnan(level), apart, level)
        with np.errstate(divide="ignore"):
            up = np.where(np.isnan(slope), level / np.tan(zenith), slope * np.cos(zenith))
        across = np.where(np.isnan(slope), level, slope * np.sin(zenith))
        rise = up + self.fall * across**2 + heights[:, 0] - heights[:, 1]
        known = np.isfinite(rise)
        return Rises(marks[known], rise[known])

    def _measured(self, kinds: list[SlopeDistances] | list[HorizontalDistances], marks: IntArray) -> FloatArray:
        """Measured distances (rows,) along pairs of marks, in either direction; NaN where there is none."""
        measured, length = _columns(kinds)
        table = PairTable(np.vstack([measured, measured[:, ::-1]]), np.concatenate([length, length]), self.count)
        return table.of(marks)


def _columns(
    kinds: list[SlopeDistances] | list[ZenithAngles] | list[HorizontalDistances],
) -> tuple[IntArray, FloatArray]:
    """Marks (rows, 2) and observed values (rows,) of all rows of some kinds."""
    if not kinds:
        return np.empty((0, 2), dtype=np.int64), np.empty(0)
    return np.vstack([rows.marks for rows in kinds]), np.concatenate([rows.observed[:, 0] for rows in kinds])
