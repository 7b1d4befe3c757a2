"""Angle sums of triangles and larger figures, and azimuths carried between known directions."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.closures import Closures
from adjust.network.closures.differences import walking_lengths
from adjust.network.closures.observed import Observed
from adjust.network.closures.orientation import Orientations
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.short_cycles import Cycles, short_cycles
from adjust.tolerances import Quantity


@dataclass(frozen=True)
class Corners:
    """The angles at the corners of walks; arrays have one entry for each corner.

    `entering` and `leaving` are nodes of one group; `rows` the observations of the angle between them, `variance`
    theirs.
    """

    entering: IntArray
    leaving: IntArray
    rows: Ragged
    variance: FloatArray

    @classmethod
    def between(cls, observed: Observed, orientations: Orientations, entering: IntArray, leaving: IntArray) -> Corners:
        """Corners with the observations on the way from one node to the other."""
        stations = orientations.stations
        edges = stations.ways(entering, leaving)
        rows = Ragged(stations.readings.rows[edges.values], edges.starts)
        return cls(entering, leaving, rows, rows.total(observed.sd[rows.values] ** 2))


def angle_closures(observed: Observed, orientations: Orientations, length: FloatArray) -> list[Closures]:
    """Closed figures of lines sighted from both ends, and azimuths carried from one known direction to another.

    `length` (lines,) is metres, NaN where unknown: figures are chosen short. Misclosure of a closed figure: the sum of
    its interior angles minus (n − 2)·180° (and, on the ellipsoid, minus what its lines' convergences sum to, the
    spherical excess); of a link: azimuth arrived at minus known azimuth.
    """
    cycles, node = _figures(orientations, length)
    link = cycles.nodes[cycles.edges.starts[:-1]] == orientations.stations.groups
    sums = _closed(observed, orientations, cycles.take(np.flatnonzero(~link)), node, length)
    links = _links(observed, orientations, cycles.take(np.flatnonzero(link)), node, length)
    corners = sums.marks.lengths - 1
    return [
        replace(sums.take(corners == 3), check="triangle", quantity=Quantity.TRIANGLE),
        replace(sums.take(corners == 4), check="quadrilateral"),
        sums.take((corners < 3) | (corners > 4)),
        links,
    ]


def _figures(orientations: Orientations, length: FloatArray) -> tuple[Cycles, IntArray]:
    """Cycles of groups, north being the last node, and the reading's node at each end (edges, 2) of their edges.

    Edges are the lines, then a tie of each oriented group to north. Lines between two marks of control carry nothing
    that their orientations do not tell.
    """
    stations, tie = orientations.stations, orientations.tie
    north = stations.groups
    groups = stations.group[orientations.lines]
    tied = np.flatnonzero(orientations.oriented)
    held = orientations.observed.held[orientations.marks, 0].all(axis=1)
    carrying = np.flatnonzero(~held | ~orientations.oriented[groups].all(axis=1))
    ends = np.vstack([groups[carrying], np.column_stack([np.full(len(tied), north), tied])])
    weights = np.concatenate([walking_lengths(length)[carrying], np.zeros(len(tied))])
    cycles = short_cycles(ends, weights, north + 1, north)
    number = np.concatenate([carrying, len(length) + tied])
    edges = Ragged(number[cycles.edges.values], cycles.edges.starts)
    node = np.full((len(length) + stations.groups, 2), -1, dtype=np.int64)
    node[: len(length)] = orientations.lines
    node[len(length) :, 1] = tie.node
    return Cycles(edges, cycles.sign, cycles.nodes), node


def _walk(cycles: Cycles, node: IntArray) -> tuple[IntArray, IntArray]:
    """Nodes (steps,) at which each step leaves one group and enters the next."""
    ends = node[cycles.edges.values]
    forward = cycles.sign > 0
    return np.where(forward, ends[:, 0], ends[:, 1]), np.where(forward, ends[:, 1], ends[:, 0])


def _turns(orientations: Orientations, cycles: Cycles) -> FloatArray:
    """Signed changes of orientation (cycles,) round each walk, wrapped."""
    of_edges = np.concatenate([orientations.turn, orientations.orientation])
    return wrapped(cycles.edges.total(cycles.sign * of_edges[cycles.edges.values]))


def _closed(
    observed: Observed, orientations: Orientations, cycles: Cycles, node: IntArray, length: FloatArray
) -> Closures:
    leaving, entered = _walk(cycles, node)
    entering = entered[_previous(cycles.edges)]
    corners = Corners.between(observed, orientations, entering, leaving)
    reading, station = orientations.stations.reading, orientations.stations.readings.station
    count = cycles.edges.lengths
    around = cycles.edges.total((reading[leaving] - reading[entering]) % FULL_TURN)
    misclosure = _turns(orientations, cycles)
    # walked with the figure on the left the clockwise angles are the interior ones; on the right, the exterior
    half_turns = np.rint((around - misclosure) / np.pi)
    outside = half_turns == count + 2
    inside = half_turns == count - 2
    total = np.where(outside, count * FULL_TURN - around, np.where(inside, around, np.nan))
    begin = station[leaving[cycles.edges.starts[:-1]]]
    marks = Ragged(
        np.insert(station[leaving], cycles.edges.starts[1:], begin), cycles.edges.starts + np.arange(len(cycles) + 1)
    )
    return Closures(
        "angle_sum",
        "rad",
        np.where(outside, -misclosure, misclosure)[:, None],
        np.sqrt(cycles.edges.total(corners.variance))[:, None],
        marks,
        Ragged(corners.rows.values, corners.rows.starts[cycles.edges.starts]),
        cycles.edges.total(length[cycles.edges.values]),
        count,
        Quantity.ANGLES,
        figures={"sum": total},
    )


def _previous(lists: Ragged) -> IntArray:
    """For each entry the place of the one before it, cyclically within its list."""
    places = np.arange(len(lists.values)) - 1
    places[lists.starts[:-1]] = lists.starts[1:] - 1
    return places


def _links(
    observed: Observed, orientations: Orientations, cycles: Cycles, node: IntArray, length: FloatArray
) -> Closures:
    leaving, entered = _walk(cycles, node)
    # the first step of a link leads from north into its first group, the last one back
    within = np.ones(len(leaving), dtype=bool)
    within[cycles.edges.starts[:-1]] = False
    corners = Corners.between(observed, orientations, entered[_previous(cycles.edges)][within], leaving[within])
    steps = Ragged(cycles.nodes[within], cycles.edges.starts - np.arange(len(cycles) + 1))
    ends = np.column_stack([steps.values[steps.starts[:-1]], steps.values[steps.starts[1:] - 1]])
    along = np.append(length, np.zeros(orientations.stations.groups))
    links = Closures(
        "azimuth_link",
        "rad",
        _turns(orientations, cycles)[:, None],
        np.sqrt(steps.total(corners.variance) + orientations.tie.variance[ends].sum(axis=1))[:, None],
        _marks_of_links(orientations, steps, ends, orientations.stations.readings.station[leaving[within]]),
        Ragged(corners.rows.values, corners.rows.starts[steps.starts]),
        cycles.edges.total(along[cycles.edges.values]),
        steps.total((corners.rows.lengths > 0).astype(np.float64)).astype(np.int64),
        Quantity.ANGLES,
    )
    return links.take(links.rows.lengths > 0)


def _marks_of_links(orientations: Orientations, steps: Ragged, ends: IntArray, stations: IntArray) -> Ragged:
    """The stations (steps,) of each link, with the control marks sighted at its ends."""
    sighted = orientations.tie.to[ends].tolist()
    return Ragged.of(
        [
            [*sighting(start), *stations[first:last].tolist(), *sighting(end)]
            for (start, end), first, last in zip(sighted, steps.starts[:-1], steps.starts[1:], strict=True)
        ]
    )


def sighting(mark: int) -> list[int]:
    """The mark sighted, if there is one."""
    return [mark] if mark >= 0 else []
