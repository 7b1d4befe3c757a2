"""What the observations say about plan positions, reduced to rounds of rays and horizontal distances.

A round is a set of readings on one mark that share one orientation: a setup of directions, the two arms of an angle,
all azimuths and vectors of a mark (these carry their orientation: the circle's zero is north). Rounds on one mark that
share a target share an orientation too and are merged.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from adjust.angles import wrapped
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.job import Job
from adjust.network.consensus import group_circular_medians, group_medians
from adjust.network.estimate import Estimate
from adjust.network.sight_lines import HorizontalLines, SightLines
from adjust.network.spread import spread
from adjust.network.working_plane import WorkingPlane
from adjust.observations import Angles, Azimuths, Directions, Vectors

SAME_READING = 3e-4
"""Relations that change by less, radians or share of a distance, leave the start as it is: three metres in ten
kilometres, which Gauss–Newton settles in one step."""


@dataclass(frozen=True)
class PlanRelations:
    """Rounds, their rays, and distances between pairs of marks, each line once.

    `station` (rounds,) is the mark of each round, `northed` (rounds,) whether its readings count from the working
    plane's north. Ray k of round `round` (rays,) goes to `target` with `reading`, radians clockwise. Distances are
    `length` (distances,), metres, between `ends` (distances, 2).
    """

    station: IntArray
    northed: BoolArray
    round: IntArray
    target: IntArray
    reading: FloatArray
    ends: IntArray
    length: FloatArray

    def differs(self, other: PlanRelations) -> bool:
        """Whether a start from the other relations would lie elsewhere."""
        if self.length.shape != other.length.shape or self.reading.shape != other.reading.shape:
            return True
        turned = np.abs(wrapped(self.reading - other.reading))
        stretched = np.abs(self.length - other.length) / self.length
        return bool(max(turned.max(initial=0.0), stretched.max(initial=0.0)) > SAME_READING)


@dataclass(frozen=True)
class _Rays:
    """Readings (rays,) from `station` to `target`, radians; rays of one `round` share one orientation."""

    station: IntArray
    target: IntArray
    reading: FloatArray
    round: IntArray


def plan_relations(job: Job, plane: WorkingPlane, estimate: Estimate, sights: SightLines) -> PlanRelations:
    """The plan relations of a job, reduced with what is known of positions and heights so far."""
    north = len(job.setups) + sum(len(rows) for rows in job.observations if isinstance(rows, Angles))
    vectors = [
        _vector_relations(rows, plane, estimate, north) for rows in job.observations if isinstance(rows, Vectors)
    ]
    kinds = [_direction_rays(rows) for rows in job.observations if isinstance(rows, Directions)]
    kinds += [_angle_rays(rows, len(job.setups)) for rows in job.observations if isinstance(rows, Angles)]
    kinds += [_azimuth_rays(rows, plane, estimate, north) for rows in job.observations if isinstance(rows, Azimuths)]
    kinds += [rays for rays, _ in vectors]
    ends, length = _distances([sights.horizontal(estimate), *(lines for _, lines in vectors)], len(job.marks))
    return _merged(_joined(kinds), north, len(job.marks), ends, length)


def _direction_rays(rows: Directions) -> _Rays:
    return _Rays(rows.marks[:, 0], rows.marks[:, 1], rows.observed[:, 0], rows.setup)


def _angle_rays(rows: Angles, first_round: int) -> _Rays:
    """Each angle is a round of two rays: 0 to `from`, the angle to `to`."""
    number = first_round + np.arange(len(rows))
    return _Rays(
        np.concatenate([rows.marks[:, 0]] * 2),
        np.concatenate([rows.marks[:, 1], rows.marks[:, 2]]),
        np.concatenate([np.zeros(len(rows)), rows.observed[:, 0]]),
        np.concatenate([number] * 2),
    )


def _azimuth_rays(rows: Azimuths, plane: WorkingPlane, estimate: Estimate, north: int) -> _Rays:
    """Azimuths from the working plane's north; the rounds of north are numbered from `north`, one for each mark."""
    at = rows.marks[:, 0]
    convergence = plane.north(estimate.points)[at]
    return _Rays(at, rows.marks[:, 1], rows.observed[:, 0] - convergence, north + at)


def _vector_relations(
    rows: Vectors, plane: WorkingPlane, estimate: Estimate, north: int
) -> tuple[_Rays, HorizontalLines]:
    """A vector is an azimuth from either end and a horizontal distance."""
    step = plane.reduced_vectors(rows.observed, rows.marks, estimate.points, estimate.spatial_heights)[0]
    start, end = rows.marks.T
    azimuth = np.angle(step)
    station = np.concatenate([start, end])
    rays = _Rays(station, np.concatenate([end, start]), np.concatenate([azimuth, azimuth + np.pi]), north + station)
    return rays, HorizontalLines(rows.marks, np.abs(step))


def _joined(kinds: list[_Rays]) -> _Rays:
    if not kinds:
        nothing = np.empty(0, dtype=np.int64)
        return _Rays(nothing, nothing, np.empty(0), nothing)
    columns = ("station", "target", "reading", "round")
    return _Rays(*(np.concatenate([getattr(kind, name) for kind in kinds]) for name in columns))


def _distances(lines: list[HorizontalLines], marks: int) -> tuple[IntArray, FloatArray]:
    """Ends (distances, 2) and median length of each line, whichever way it was measured."""
    ends = np.sort(np.vstack([line.marks for line in lines]), axis=1)
    length = np.concatenate([line.length for line in lines])
    usable = (length > 0.0) & (ends[:, 0] != ends[:, 1])
    keys, median = group_medians(ends[usable, 0] * marks + ends[usable, 1], length[usable])
    return np.column_stack([keys // marks, keys % marks]), median


def _merged(rays: _Rays, north: int, marks: int, ends: IntArray, length: FloatArray) -> PlanRelations:
    """Rounds on one mark that share a target become one: their readings differ by a constant."""
    numbers, first, numbered = np.unique(rays.round, return_index=True, return_inverse=True)
    station, northed = rays.station[first], numbers >= north
    sight_keys, reading = group_circular_medians(numbered * marks + rays.target, rays.reading)
    number, target = sight_keys // marks, sight_keys % marks
    order = np.lexsort((number, target, station[number]))
    shared = _following_alike(station[number][order], target[order])
    one, other = order[:-1][shared], order[1:][shared]
    pair, turn = group_circular_medians(number[one] * len(station) + number[other], reading[one] - reading[other])
    before, after = pair // max(len(station), 1), pair % max(len(station), 1)
    links = csr_array((np.ones(len(pair)), (before, after)), shape=(len(station),) * 2)
    count, label = connected_components(links, directed=False)
    anchors = _anchors(label, northed, count)
    offset = np.full(len(station), np.nan)
    offset[anchors] = 0.0
    offset = spread(offset, before, after, turn)
    keys, merged = group_circular_medians(label[number].astype(np.int64) * marks + target, reading + offset[number])
    return PlanRelations(station[anchors], northed[anchors], keys // marks, keys % marks, merged, ends, length)


def _following_alike(station: IntArray, target: IntArray) -> BoolArray:
    """Whether each sight (rays − 1,) is of the same line as the next one."""
    alike: BoolArray = (station[1:] == station[:-1]) & (target[1:] == target[:-1])
    return alike


def _anchors(label: IntArray, northed: BoolArray, count: int) -> IntArray:
    """One round (merged rounds,) for each merged one: the round of north if it has one, else its first."""
    order = np.lexsort((np.arange(len(label)), ~northed, label))
    first = np.searchsorted(label[order], np.arange(count))
    anchors: IntArray = order[first]
    return anchors
