"""Distances and zenith angles brought to marks: horizontal lengths and trigonometric rises, row by row."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import PlaneFrame
from adjust.network.closures.closures import Closures
from adjust.network.closures.differences import Differences
from adjust.network.closures.levelling import no_differences, run_closures, sds
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.observations import HorizontalDistances, SlopeDistances, ZenithAngles
from adjust.observations.zenith import EARTH_RADIUS
from adjust.tolerances import Quantity


class PairIndex:
    """Finds the first row of a table of pairs (rows, 2) by its pair, in the order of its ends."""

    def __init__(self, pairs: IntArray, marks: int) -> None:
        self._factor = np.array([marks, 1])
        self._keys, self._first = np.unique(pairs @ self._factor, return_index=True)

    def of(self, pairs: IntArray) -> IntArray:
        """Rows (pairs,), −1 where there is none."""
        if not len(self._keys):
            return np.full(len(pairs), -1, dtype=np.int64)
        wanted = pairs @ self._factor
        place = np.minimum(np.searchsorted(self._keys, wanted), len(self._keys) - 1)
        return np.where(self._keys[place] == wanted, self._first[place], -1)


@dataclass(frozen=True)
class Measured:
    """Rows with their pair of `marks` (rows, 2), a `value` (rows,), its `variance` and the observations' numbers."""

    marks: IntArray
    value: FloatArray
    variance: FloatArray
    rows: Ragged


class Lines:
    """The distances and zenith angles of a job, reduced as far as each other and the known heights allow."""

    def __init__(self, observed: Observed) -> None:
        self.observed = observed
        job = observed.job
        self.marks = len(job.marks)
        self.slopes, self.slope_rows = observed.rows_of(SlopeDistances)
        self.horizontals, self.horizontal_rows = observed.rows_of(HorizontalDistances)
        self.zeniths, self.zenith_rows = observed.rows_of(ZenithAngles)
        self.zenith = self._zeniths_from_normal()
        """Zenith angles (rows,) counted from the frame's own vertical, radians."""
        self.plane = isinstance(job.frame, PlaneFrame)
        curved = not isinstance(job.frame, PlaneFrame) or job.frame.earth_curvature
        self.refraction = job.refraction_coefficient
        self.curvature = 1.0 / (2.0 * EARTH_RADIUS) if curved else 0.0

    def _zeniths_from_normal(self) -> FloatArray:
        """Zenith angles freed of the deflection of the vertical, where the marks' places are known."""
        if self.zeniths is None:
            return np.empty(0)
        read, geometry = self.zeniths.observed[:, 0], self.observed.geometry
        if isinstance(geometry.frame, PlaneFrame) or not np.any(geometry.deflection):
            return read
        normal, plumb = (
            np.arctan2(np.hypot(enu[:, 0], enu[:, 1]), enu[:, 2])
            for enu in (geometry.sight(*self.zeniths.marks.T, plumb=turned).enu for turned in (False, True))
        )
        turned_back: FloatArray = read + np.nan_to_num(normal - plumb)
        return turned_back

    @cached_property
    def horizontal(self) -> Measured:
        """Every distance (rows,) reduced to the horizontal; NaN where nothing tells a slope's inclination.

        By the zenith angle of the same sight, of the sight back, else by heights known so far: s = D sin z′, with z′
        the zenith angle as a chord would have it; or s = √(D² − Δu²).
        """
        parts = []
        if self.horizontals:
            sd = self.observed.sd[self.horizontal_rows]
            parts.append((self.horizontals.marks, self.horizontals.observed[:, 0], sd**2, self.horizontal_rows))
        if self.slopes:
            level = self._levelled(self.slopes)
            sd = self.observed.sd[self.slope_rows]
            parts.append((self.slopes.marks, level, sd**2, self.slope_rows))
        if not parts:
            return Measured(np.empty((0, 2), dtype=np.int64), np.empty(0), np.empty(0), Ragged.of([]))
        marks, value, variance, rows = (np.concatenate(columns) for columns in zip(*parts, strict=True))
        return Measured(marks, value, variance, Ragged(rows, np.arange(len(rows) + 1)))

    def _levelled(self, slopes: SlopeDistances) -> FloatArray:
        slope, heights = slopes.observed[:, 0], slopes.heights
        forward, back = (self._zenith_of(pairs) for pairs in (slopes.marks, slopes.marks[:, ::-1]))
        by_zenith = self._level_of(forward[:, 0], slope)
        back_chord = self._chord_zenith(back[:, 0], self._level_of(back[:, 0], slope))
        above_mark = slope * np.cos(back_chord) + back[:, 1] - back[:, 2]
        by_return = _without(slope, heights[:, 1] - heights[:, 0] - above_mark)
        known = self.observed.geometry.spatial[:, 2]
        rise = known[slopes.marks[:, 1]] - known[slopes.marks[:, 0]]
        by_heights = _without(slope, rise + heights[:, 1] - heights[:, 0])
        level = np.where(np.isfinite(by_zenith), by_zenith, np.where(np.isfinite(by_return), by_return, by_heights))
        if self.plane:
            return level
        # verticals spread upwards: the sight runs above the marks by the mean height of instrument and target
        lowered: FloatArray = level * (1.0 - heights.mean(axis=1) / EARTH_RADIUS)
        return lowered

    def _chord_zenith(self, zenith: FloatArray, level: FloatArray) -> FloatArray:
        """Zenith angles (rows,) as a chord would have them at its middle, radians, of the observed ones over a level
        distance s: in a plane cot z′ = cot z + (1 − k) s / 2R, on the ellipsoid z′ = z + k D / 2R − s / 2R."""
        bending = self.refraction * self.curvature
        if self.plane:
            with np.errstate(divide="ignore"):
                steepness: FloatArray = 1.0 / np.tan(zenith) + (self.curvature - bending) * level
            return np.arctan2(1.0, steepness)
        chord: FloatArray = zenith + bending * level / np.sin(zenith) - self.curvature * level
        return chord

    def _level_of(self, zenith: FloatArray, slope: FloatArray) -> FloatArray:
        """Level distances (rows,) of slopes with their zenith angles; the second step leaves nothing over."""
        level = slope * np.sin(zenith)
        for _ in range(2):
            level = slope * np.sin(self._chord_zenith(zenith, level))
        return level

    def _zenith_of(self, pairs: IntArray) -> FloatArray:
        """Zenith angle, instrument and target height (rows, 3) of the first row that has a pair; NaN where none has."""
        if self.zeniths is None:
            return np.full((len(pairs), 3), np.nan)
        row = PairIndex(self.zeniths.marks, self.marks).of(pairs)
        found = np.column_stack([self.zenith, self.zeniths.heights])[row]
        return np.where((row >= 0)[:, None], found, np.nan)

    @cached_property
    def lengths(self) -> Differences:
        """One horizontal length for each pair of marks: the mean of all its rows. `value` is the length itself."""
        measured = self.horizontal
        known = np.isfinite(measured.value)
        marks, value = np.sort(measured.marks[known], axis=1), measured.value[known]
        rows = measured.rows.take(np.flatnonzero(known))
        return Differences(marks, value[:, None], measured.variance[known][:, None, None], value, rows).means()

    def length_of(self, pairs: IntArray) -> FloatArray:
        """Measured horizontal lengths (pairs,), else those between the marks' coordinates; NaN where neither is
        known."""
        place = PairIndex(self.lengths.marks, self.marks).of(np.sort(pairs, axis=1))
        measured = np.append(self.lengths.length, np.nan)[place]
        apart = self.observed.geometry.level_distance(pairs[:, 0], pairs[:, 1])[0]
        return np.where(np.isnan(measured), apart, measured)

    def _variance_of(self, pairs: IntArray) -> FloatArray:
        """Variances (pairs,) of the measured lengths, m²; 0 where coordinates gave them."""
        place = PairIndex(self.lengths.marks, self.marks).of(np.sort(pairs, axis=1))
        return np.append(self.lengths.covariance[:, 0, 0], 0.0)[place]

    @cached_property
    def rises(self) -> Differences:
        """Trigonometric rises above the plane or the ellipsoid: s cot z′ + instrument height − target height, of every
        zenith angle whose distance is known."""
        if self.zeniths is None:
            return no_differences(1)
        zenith, heights = self.zenith, self.zeniths.heights
        level = self.length_of(self.zeniths.marks)
        with np.errstate(divide="ignore", invalid="ignore"):
            rise = level / np.tan(self._chord_zenith(zenith, level)) + heights[:, 0] - heights[:, 1]
            variance = (level / np.sin(zenith) ** 2 * self.observed.sd[self.zenith_rows]) ** 2
            variance += self._variance_of(self.zeniths.marks) / np.tan(zenith) ** 2
        known = np.flatnonzero(np.isfinite(rise) & np.isfinite(variance))
        return Differences(
            self.zeniths.marks[known],
            rise[known, None],
            variance[known, None, None],
            level[known],
            Ragged(self.zenith_rows[known], np.arange(len(known) + 1)),
        )


def distance_closures(lines: Lines) -> list[Closures]:
    """Distances of the same line against its first one, whichever end they were measured from."""
    measured = lines.horizontal
    known = np.isfinite(measured.value)
    runs = Differences(
        np.sort(measured.marks[known], axis=1),
        measured.value[known, None],
        measured.variance[known, None, None],
        measured.value[known],
        measured.rows.take(np.flatnonzero(known)),
    )
    return [run_closures("distance_repeats", runs.repeats(), Quantity.DISTANCE)]


def zenith_closures(lines: Lines) -> list[Closures]:
    """Trigonometric rises of the same line: from both ends (reciprocal), or again from the same end.

    Misclosure of a reciprocal pair: the rises there and back disagree by that much. `refraction` is the coefficient k
    for which they would agree: k = job's k + misclosure · R / s², sd beside it; it says little on short lines.
    """
    rises = lines.rises
    index = PairIndex(rises.marks, lines.marks)
    first = index.of(rises.marks)
    back = index.of(rises.marks[:, ::-1])
    outward = (rises.marks[:, 0] < rises.marks[:, 1]) & (first == np.arange(len(rises)))
    one = np.flatnonzero(outward & (back >= 0))
    reciprocal = _pairs("reciprocal_zenith", rises, one, back[one], 1.0)
    per_metre = EARTH_RADIUS / reciprocal.length**2 if lines.curvature else np.full(len(reciprocal), np.nan)
    k = lines.observed.job.refraction_coefficient + reciprocal.misclosure[:, 0] * per_metre
    figures = {"refraction": k, "refraction_sd": reciprocal.sd[:, 0] * per_metre}
    again = np.flatnonzero(first != np.arange(len(rises)))
    return [replace(reciprocal, figures=figures), _pairs("zenith_repeats", rises, first[again], again, -1.0)]


def _pairs(check: str, rises: Differences, one: IntArray, other: IntArray, sign: float) -> Closures:
    """Rises `one` plus or minus rises `other`."""
    marks = np.column_stack([rises.marks[one], rises.marks[one, 0]])
    covariance = rises.covariance[one] + rises.covariance[other]
    rows = np.column_stack([rises.rows.values[one], rises.rows.values[other]])
    return Closures(
        check,
        "m",
        rises.value[one] + sign * rises.value[other],
        sds(covariance),
        Ragged(marks.ravel(), np.arange(len(one) + 1) * 3),
        Ragged(rows.ravel(), np.arange(len(one) + 1) * 2),
        rises.length[one],
        np.zeros(len(one), dtype=np.int64),
    )


def _without(slope: FloatArray, rise: FloatArray) -> FloatArray:
    """√(D² − Δu²) (rows,), NaN where the rise is unknown or more than the distance."""
    with np.errstate(invalid="ignore"):
        return np.sqrt(slope**2 - rise**2)
