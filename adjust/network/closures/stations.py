"""What was observed at each station, put together: readings towards its targets that share one orientation.

Directions of a round, angles and azimuths at one mark form a graph: its nodes are the round's zero, north, and the
targets; its edges the readings. A forest of it gives every target of a connected part a reading in one system; each
reading outside the forest closes a figure of angles round the station.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from adjust.angles import wrapped
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import Geometry, PlaneFrame
from adjust.network.closures.closures import Closures
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.short_cycles import short_cycles
from adjust.observations import Angles, Azimuths, Directions
from adjust.observations.direction import azimuth_of
from adjust.tolerances import Quantity

NO_ROW = -1


@dataclass(frozen=True)
class Readings:
    """The edges of the stations' graphs: `value` (rows,) of node `ends[:, 1]` minus that of `ends[:, 0]`, radians.

    Nodes are numbered: sights first, then the zeros of rounds, then the norths of marks. `sights` (sights, 2) are the
    station and target of each sight, sorted; `rows` the observations' numbers; `station` (nodes,) the mark of each
    node.
    """

    ends: IntArray
    value: FloatArray
    rows: IntArray
    sights: IntArray
    station: IntArray
    rounds: int


def read_stations(observed: Observed) -> Readings:
    """All directions, angles and azimuths of a job."""
    job = observed.job
    marks, rounds = len(job.marks), len(job.setups)
    directions, direction_rows = observed.rows_of(Directions)
    angles, angle_rows = observed.rows_of(Angles)
    azimuths, azimuth_rows = observed.rows_of(Azimuths)
    sighted = [kind.marks[:, [0, role]] for kind in (directions, angles, azimuths) if kind for role in _sights(kind)]
    sights, node = np.unique(np.vstack([np.empty((0, 2), np.int64), *sighted]), axis=0, return_inverse=True)
    nodes = iter(np.split(node.ravel(), np.cumsum([len(part) for part in sighted])[:-1]) if sighted else ())
    station = np.concatenate([sights[:, 0], np.zeros(rounds, dtype=np.int64), np.arange(marks)])
    ends, values = [np.empty((0, 2), dtype=np.int64)], [np.empty(0)]
    if directions:
        station[len(sights) + directions.setup_index] = directions.marks[:, 0]
        ends.append(np.column_stack([len(sights) + directions.setup_index, next(nodes)]))
        values.append(directions.observed[:, 0])
    if angles:
        ends.append(np.column_stack([next(nodes), next(nodes)]))
        values.append(angles.observed[:, 0])
    if azimuths:
        ends.append(np.column_stack([len(sights) + rounds + azimuths.marks[:, 0], next(nodes)]))
        values.append(azimuths.observed[:, 0] + plumb_turn(observed.geometry, azimuths.marks))
    rows = np.concatenate([direction_rows, angle_rows, azimuth_rows])
    return Readings(np.vstack(ends), np.concatenate(values), rows, sights, station, rounds)


def _sights(kind: Directions | Angles | Azimuths) -> tuple[int, ...]:
    """The roles of the marks that a kind sights."""
    return tuple(range(1, kind.marks.shape[1]))


def plumb_turn(geometry: Geometry, sights: IntArray) -> FloatArray:
    """What to add to azimuths from the normal (sights,) to have them from the plumb line, radians; 0 in a plane."""
    if isinstance(geometry.frame, PlaneFrame):
        return np.zeros(len(sights))
    normal, plumb = (geometry.sight(sights[:, 0], sights[:, 1], plumb=turned).enu for turned in (False, True))
    return np.nan_to_num(wrapped(azimuth_of(plumb) - azimuth_of(normal)))


class Stations:
    """The readings of all stations, a forest through them, and the groups of targets that it joins.

    `group` (nodes,) numbers the connected parts, `reading` (nodes,) is radians in the part's own system; `above`
    (nodes,) the node before on the way to the part's root (itself at the root), `through` (nodes,) the row on that
    way.
    """

    def __init__(self, observed: Observed) -> None:
        from scipy.sparse import csr_array
        from scipy.sparse.csgraph import breadth_first_order, connected_components

        self.readings = readings = read_stations(observed)
        self.marks = len(observed.job.marks)
        count = len(readings.station)
        shape = (count + 1, count + 1)
        links = csr_array((np.ones(len(readings.ends)), (readings.ends[:, 0], readings.ends[:, 1])), shape=shape)
        self.groups, group = connected_components(links, directed=False)
        self.group: IntArray = group[:-1].astype(np.int64)
        # zeros of rounds and norths are numbered last: most sights then hang directly below their root
        roots = count - 1 - np.unique(self.group[::-1], return_index=True)[1]
        rooted = csr_array((np.ones(len(roots)), (np.full(len(roots), count), roots)), shape=shape)
        order, before = breadth_first_order(links + rooted, count, directed=False)
        self.above = np.where(before[:-1] == count, np.arange(count), before[:-1]).astype(np.int64)
        self.through = self._edges_of_forest()
        self.reading = self._readings(order[order < count])

    def _edges_of_forest(self) -> IntArray:
        """The first edge (nodes,) between each node and the one above it; −1 at a root."""
        ends, count = self.readings.ends, len(self.above)
        key = np.sort(ends, axis=1) @ np.array([count, 1])
        keys, first = np.unique(key, return_index=True)
        wanted = np.sort(np.column_stack([np.arange(count), self.above]), axis=1) @ np.array([count, 1])
        if not len(keys):
            return np.full(count, NO_ROW, dtype=np.int64)
        place = np.minimum(np.searchsorted(keys, wanted), len(keys) - 1)
        return np.where(keys[place] == wanted, first[place], NO_ROW)

    def _readings(self, order: IntArray) -> FloatArray:
        reading = np.zeros(len(self.above))
        values, ends = self.readings.value.tolist(), self.readings.ends.tolist()
        above, through = self.above.tolist(), self.through.tolist()
        for node in order.tolist():
            edge = through[node]
            if edge != NO_ROW:
                forward = ends[edge][1] == node
                reading[node] = reading[above[node]] + (values[edge] if forward else -values[edge])
        return reading

    @cached_property
    def _sight_keys(self) -> IntArray:
        keys: IntArray = self.readings.sights @ np.array([self.marks, 1])
        return keys

    def sight(self, sights: IntArray) -> IntArray:
        """Nodes (rows,) of sights (rows, 2), station and target; −1 where there is no such sight."""
        keys = self._sight_keys
        if not len(keys):
            return np.full(len(sights), -1, dtype=np.int64)
        wanted = sights @ np.array([self.marks, 1])
        place = np.minimum(np.searchsorted(keys, wanted), len(keys) - 1)
        return np.where(keys[place] == wanted, place, -1)

    @cached_property
    def north(self) -> IntArray:
        """For each group (groups,) the node of a north in it that azimuths were read from, −1 where there is none."""
        north = np.full(self.groups, -1, dtype=np.int64)
        first = len(self.readings.sights) + self.readings.rounds
        used = np.unique(self.readings.ends[:, 0])
        used = used[used >= first]
        north[self.group[used]] = used
        return north

    def ways(self, one: IntArray, other: IntArray) -> Ragged:
        """Edges of the forest between pairs of nodes (pairs,), each of one group."""
        same = one == other
        beside = ~same & (self.above[one] == self.above[other]) & (self.through[one] >= 0) & (self.through[other] >= 0)
        lists: list[Sequence[int]] = np.column_stack([self.through[one], self.through[other]]).tolist()
        for place in np.flatnonzero(~beside).tolist():
            lists[place] = self.way(int(one[place]), int(other[place]))
        return Ragged.of(lists)

    def way(self, one: int, other: int) -> list[int]:
        """Edges of the forest between two nodes of a group."""
        up_one, up_other = self._way_up(one), self._way_up(other)
        while up_one and up_other and up_one[-1] == up_other[-1]:
            up_one.pop()
            up_other.pop()
        return up_one + up_other[::-1]

    def _way_up(self, node: int) -> list[int]:
        edges = []
        while self.through[node] != NO_ROW:
            edges.append(int(self.through[node]))
            node = int(self.above[node])
        return edges

    def outside(self) -> BoolArray:
        """Readings (edges,) that the forest does without."""
        outside = np.ones(len(self.readings.ends), dtype=bool)
        outside[self.through[self.through != NO_ROW]] = False
        return outside


def station_closures(observed: Observed, stations: Stations) -> list[Closures]:
    """Angles round a station that have to come back to where they began.

    A horizon is closed by measured angles that follow one another all the way round; everything else that closes is an
    angle observed more than once, in another round or by other readings. Misclosure: what is left after going round.
    """
    readings = stations.readings
    doubtful = np.unique(stations.group[readings.ends[stations.outside(), 0]])
    chosen = np.flatnonzero(np.isin(stations.group[readings.ends[:, 0]], doubtful))
    cycles = short_cycles(readings.ends[chosen], np.ones(len(chosen)), len(readings.station))
    edges = chosen[cycles.edges.values]
    rows = readings.rows[edges]
    misclosure = wrapped(cycles.edges.total(cycles.sign * readings.value[edges]))
    angles_only = np.isin(rows, observed.rows_of(Angles)[1])
    one_way = np.abs(cycles.edges.total(np.where(angles_only, cycles.sign, 0.0))) == cycles.edges.lengths
    sense = cycles.sign[cycles.edges.starts[:-1]]
    station = readings.station[cycles.nodes[cycles.edges.starts[:-1]]]
    whole = Closures(
        "repeated_angle",
        "rad",
        np.where(one_way, sense * misclosure, misclosure)[:, None],
        np.sqrt(cycles.edges.total(observed.sd[rows] ** 2))[:, None],
        Ragged(station, np.arange(len(station) + 1)),
        Ragged(rows, cycles.edges.starts),
        np.full(len(station), np.nan),
        cycles.edges.lengths,
        Quantity.STATION,
    )
    return [replace(whole.take(one_way), check="horizon"), whole.take(~one_way)]
