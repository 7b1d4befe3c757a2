"""From pointings to directions, zenith angles and slope distances: one reduction for each, over all setups."""

from __future__ import annotations

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.reductions import faces
from adjust.reductions.circle import first_of_groups, group_sums, number_groups
from adjust.reductions.distance import BothEnds, mark_to_mark, means_of_both_ends
from adjust.reductions.faces import FaceMeans
from adjust.reductions.horizon import horizon_closures
from adjust.reductions.outcome import FaceErrors, Horizons, Means, Reduced, Scatter, no_errors
from adjust.reductions.pointings import Pointings
from adjust.reductions.spread import mean_of_repeats
from adjust.reductions.station import adjust_station

LEVEL = np.pi / 2
"""Zenith angle of a sight whose vertical circle was not read."""


def reduce_directions(book: Pointings, setups: int) -> Reduced:
    """Directions of every setup from the readings of the horizontal circle: faces, then station adjustment.

    A collimation error is taken from single faces: the instrument's known one, or else the mean of the setup's pairs.
    Setups or parts of one that sight a single target give no direction.
    """
    chosen = np.flatnonzero(~np.isnan(book.circle))
    rows = book.take(chosen)
    group, groups = number_groups(rows.setup, rows.turn, rows.to)
    first = first_of_groups(group, groups)
    zenith = _zenith_of_groups(rows, group, groups)
    means = faces.mean_of_faces(faces.horizontal_as_left(rows.circle, rows.face), rows.face, group, groups)
    collimation = faces.collimation_of(means.error, zenith)
    known = _known_errors(rows.collimation[first], collimation, rows.setup[first], setups)
    value = faces.corrected_single_faces(means, faces.effect_of_collimation(known, zenith))
    variance = means.variance * rows.direction_sd[first] ** 2
    target, targets = number_groups(rows.setup, rows.to)
    turn, _ = number_groups(rows.setup[first], rows.turn[first])
    stations = _Stations(targets, groups, setups)
    stations.adjust(value, target[first], turn, variance, rows.setup[first])
    kept = stations.tied(rows.setup[first_of_groups(target, targets)])
    row = chosen[first_of_groups(target, targets)]
    provenance = rows.provenance.gathered(group, groups)
    return Reduced(
        Means(
            row,
            stations.direction,
            np.sqrt(stations.variance),
            stations.part,
            rows.provenance.gathered(target, targets),
        ).take(kept),
        FaceErrors(rows.setup[first], rows.to[first], collimation, provenance).take(~np.isnan(collimation)),
        Scatter(rows.setup[first], rows.to[first], stations.residual, np.sqrt(variance), provenance),
        stations.redundancy,
        _of_setups(rows.direction_sd, rows.setup, setups),
        _uncorrected(means, known),
    )


class _Stations:
    """The station adjustments of all setups, put side by side: targets (targets,), readings (readings,)."""

    def __init__(self, targets: int, readings: int, setups: int) -> None:
        self.direction, self.variance = np.zeros(targets), np.zeros(targets)
        self.part: IntArray = np.zeros(targets, dtype=np.int64)
        self.residual = np.zeros(readings)
        self.redundancy: IntArray = np.zeros(setups, dtype=np.int64)

    def adjust(
        self, value: FloatArray, target: IntArray, turn: IntArray, variance: FloatArray, setup: IntArray
    ) -> None:
        """Adjust setup by setup."""
        order = np.argsort(setup, kind="stable")
        for rows in np.split(order, np.flatnonzero(np.diff(setup[order])) + 1) if len(order) else ():
            targets, target_here = np.unique(target[rows], return_inverse=True)
            _, turn_here = np.unique(turn[rows], return_inverse=True)
            station = adjust_station(value[rows], target_here, turn_here, variance[rows])
            self.direction[targets], self.variance[targets] = station.direction, station.variance
            self.part[targets], self.residual[rows] = station.part, station.residual
            self.redundancy[setup[rows[0]]] = station.redundancy

    def tied(self, setup: IntArray) -> BoolArray:
        """Targets (targets,) that have another one in their part; `setup` (targets,)."""
        place, count = number_groups(setup, self.part)
        tied: BoolArray = np.bincount(place, minlength=count)[place] > 1
        return tied


def reduce_zeniths(book: Pointings, setups: int) -> Reduced:
    """Zenith angles from the readings of the vertical circle: faces, then means over the rounds.

    Readings to one target at one height are one observation. An index error is taken from single faces as the
    collimation error is from directions.
    """
    chosen = np.flatnonzero(~np.isnan(book.zenith))
    rows = book.take(chosen)
    sight, _ = number_groups(rows.setup, rows.to, *rows.heights.T)
    group, groups = number_groups(sight, rows.turn)
    first = first_of_groups(group, groups)
    means = faces.mean_of_faces(faces.zenith_as_left(rows.zenith, rows.face), rows.face, group, groups)
    known = _known_errors(rows.index[first], means.error, rows.setup[first], setups)
    value = faces.corrected_single_faces(means, known)
    variance = means.variance * rows.zenith_sd[first] ** 2
    reduced = _means_of_sights(rows, chosen, sight, group, value, variance, setups)
    errors = FaceErrors(rows.setup[first], rows.to[first], means.error, rows.provenance.gathered(group, groups))
    errors = errors.take(~means.single)
    stated = _of_setups(rows.zenith_sd, rows.setup, setups)
    return Reduced(reduced.means, errors, reduced.scatter, reduced.redundancy, stated, _uncorrected(means, known))


def reduce_slopes(book: Pointings, setups: int) -> Reduced:
    """Slope distances: means of the repeats to one target at one height, corrected readings as they stand.

    Repeats lessen the constant part of the instrument's sd and leave the proportional one, which air and frequency
    make, and which all share (common practice, no source). `Means.sd` is the constant part, and so is what the spread
    of the repeats is compared with, where the instrument has one.
    """
    chosen = np.flatnonzero(~np.isnan(book.slope))
    rows = book.take(chosen)
    sight, sights = number_groups(rows.setup, rows.to, *rows.heights.T)
    alone, equal = np.arange(len(rows)), np.ones(len(rows))
    reduced = _means_of_sights(rows, chosen, sight, alone, rows.slope, equal, setups)
    count = np.bincount(sight, minlength=sights)
    first = first_of_groups(sight, sights)
    constant = rows.distance_sd[first] / np.sqrt(count)
    means = Means(reduced.means.row, reduced.means.value, constant, reduced.means.part, reduced.means.provenance)
    sd = np.where(rows.distance_sd > 0, rows.distance_sd, rows.proportional * rows.slope)
    scatter = Scatter(rows.setup, rows.to, reduced.scatter.residual, sd, rows.provenance)
    return Reduced(means, reduced.errors, scatter, reduced.redundancy, _of_setups(sd, rows.setup, setups))


def _means_of_sights(
    rows: Pointings,
    chosen: IntArray,
    sight: IntArray,
    group: IntArray,
    value: FloatArray,
    variance: FloatArray,
    setups: int,
) -> Reduced:
    """Means of values (groups,) over the sights, both of them groups of rows, the first within the second."""
    sights = int(sight.max(initial=-1)) + 1
    first = first_of_groups(group, len(value))
    repeats = mean_of_repeats(value, variance, sight[first], sights)
    row, setup = first_of_groups(sight, sights), rows.setup[first]
    redundancy = np.bincount(setup, minlength=setups) - np.bincount(rows.setup[row], minlength=setups)
    provenance = rows.provenance
    one_part: IntArray = np.zeros(sights, dtype=np.int64)
    return Reduced(
        Means(chosen[row], repeats.mean, np.sqrt(repeats.variance), one_part, provenance.gathered(sight, sights)),
        no_errors(provenance),
        Scatter(setup, rows.to[first], repeats.residual, np.sqrt(variance), provenance.gathered(group, len(value))),
        redundancy,
        np.full(setups, np.nan),
    )


def closed_horizons(book: Pointings) -> Horizons:
    """The half-rounds that came back to their first target."""
    rows = book.take(~np.isnan(book.circle))
    half, halves = number_groups(rows.setup, rows.turn, rows.face)
    closures = horizon_closures(rows.circle, rows.to, half, halves)
    ends = np.concatenate([closures.first, closures.last])
    count = len(closures.first)
    return Horizons(
        rows.setup[closures.first],
        rows.to[closures.first],
        rows.face[closures.first],
        closures.misclosure,
        rows.provenance.take(ends).gathered(np.tile(np.arange(count), 2), count),
    )


def compare_both_ends(book: Pointings, slopes: Means, zeniths: Means) -> BothEnds:
    """Slope distances of lines measured from either end, reduced from mark to mark with the zenith angle of the same
    sight. Sights without one, and lines measured from one end, are left out."""
    rows = np.concatenate([slopes.row, zeniths.row])
    sight, sights = number_groups(book.setup[rows], book.to[rows], *book.heights[rows].T)
    of_slope, of_zenith = sight[: len(slopes)], sight[len(slopes) :]
    zenith = np.full(sights, np.nan)
    zenith[of_zenith] = zeniths.value
    both = ~np.isnan(zenith[of_slope])
    row, value = slopes.row[both], slopes.value[both]
    reduced = mark_to_mark(value, zenith[of_slope[both]], *book.heights[row].T)
    variance = slopes.sd[both] ** 2 + (book.proportional[row] * value) ** 2
    return means_of_both_ends(book.at[row], book.to[row], reduced, variance)


def _zenith_of_groups(rows: Pointings, group: IntArray, groups: int) -> FloatArray:
    """Mean zenith angle (groups,) as far as it was read, `LEVEL` where it was not."""
    angle = faces.zenith_as_left(rows.zenith, rows.face)
    read = ~np.isnan(angle)
    count = group_sums(read.astype(float), group, groups)
    total = group_sums(np.where(read, angle, 0.0), group, groups)
    return np.where(count > 0, total / np.maximum(count, 1.0), LEVEL)


def _known_errors(stated: FloatArray, found: FloatArray, setup: IntArray, setups: int) -> FloatArray:
    """Errors of the instrument (groups,): the one stated, or else the mean of those found in the same setup, or NaN."""
    paired = ~np.isnan(found)
    with np.errstate(invalid="ignore"):
        mean = group_sums(np.where(paired, found, 0.0), setup, setups) / np.bincount(setup[paired], minlength=setups)
    return np.where(np.isnan(stated), mean[setup], stated)


def _of_setups(values: FloatArray, setup: IntArray, setups: int) -> FloatArray:
    """A value (rows,) that is the same in all rows of a setup, by setup; NaN where it has no rows."""
    found = np.full(setups, np.nan)
    found[setup] = values
    return found


def _uncorrected(means: FaceMeans, known: FloatArray) -> int:
    return int(np.count_nonzero(means.single & np.isnan(known)))
