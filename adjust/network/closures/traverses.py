"""Legs between stations, measured in direction and length, and the traverses that they form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.lines import Lines, PairIndex
from adjust.network.closures.observed import Observed
from adjust.network.closures.orientation import Orientations
from adjust.network.closures.short_cycles import Cycles, short_cycles


@dataclass(frozen=True)
class Legs:
    """Lines with a measured length, as edges between places; arrays (legs,) unless said otherwise.

    A place is a group of readings, where the angle between two legs is measured, or a bare mark, where it is not:
    groups come first, then marks, all control in one place, the last. `places`, `nodes` (legs, 2): the place at each
    end and the reading's node there (−1 at a bare mark). `marks` (legs, 2); `line` is the place in the lines' lengths,
    −1 for a step between a mark and what stands on it. `turn` leads from the orientation of the first place to the
    second.
    """

    places: IntArray
    nodes: IntArray
    marks: IntArray
    line: IntArray
    turn: FloatArray


def find_legs(observed: Observed, orientations: Orientations, lines: Lines) -> tuple[Legs, int]:
    """Every leg of the job, and how many places there are."""
    stations = orientations.stations
    marks = len(observed.job.marks)
    held = observed.held[:, 0]
    bare = np.where(held, stations.groups + marks, stations.groups + np.arange(marks))
    measured = PairIndex(lines.lengths.marks, marks)
    parts = [
        _both_ways(orientations, measured),
        _one_way(orientations, measured, bare),
        _occupations(orientations, bare),
    ]
    legs = Legs(*(np.concatenate(columns) for columns in zip(*(vars(part).values() for part in parts), strict=True)))
    # a line between two marks of control is compared with their coordinates at once
    kept = ~(held[legs.marks].all(axis=1) & (legs.line >= 0))
    return Legs(*(column[kept] for column in vars(legs).values())), stations.groups + marks + 1


def _both_ways(orientations: Orientations, measured: PairIndex) -> Legs:
    """Lines sighted from both ends."""
    line = measured.of(np.sort(orientations.marks, axis=1))
    chosen = line >= 0
    nodes = orientations.lines[chosen]
    group = orientations.stations.group
    return Legs(group[nodes], nodes, orientations.marks[chosen], line[chosen], orientations.turn[chosen])


def _one_way(orientations: Orientations, measured: PairIndex, bare: IntArray) -> Legs:
    """Lines sighted from one end: the other one is a bare mark, or a station that azimuths orient as they do this
    one."""
    stations, sights = orientations.stations, orientations.stations.readings.sights
    line = measured.of(np.sort(sights, axis=1))
    node = np.flatnonzero((line >= 0) & (stations.sight(sights[:, ::-1]) < 0))
    at, to = sights[node].T
    places = np.column_stack([stations.group[node], bare[to]])
    nodes = np.column_stack([node, np.full(len(node), -1)])
    return Legs(places, nodes, np.column_stack([at, to]), line[node], np.full(len(node), np.nan))


def _occupations(orientations: Orientations, bare: IntArray) -> Legs:
    """The step from a mark to what was read on it."""
    stations = orientations.stations
    group, first = np.unique(stations.group[: len(stations.readings.sights)], return_index=True)
    mark = stations.readings.sights[first, 0]
    none = np.full(len(group), -1, dtype=np.int64)
    return Legs(
        np.column_stack([bare[mark], group]),
        np.column_stack([none, none]),
        np.column_stack([mark, mark]),
        none,
        np.full(len(group), np.nan),
    )


@dataclass(frozen=True)
class Step:
    """One leg of a traverse as walked: from mark to mark, the nodes of the sights along it (−1: not sighted from
    there), the groups it leaves and enters (−1: a bare mark), its place in the lines' lengths, and its turn as
    walked."""

    start: int
    end: int
    leaving: int
    entering: int
    group: int
    next_group: int
    line: int
    turn: float


Walk = list[Step]
"""The legs of one traverse, begun at a bare mark where it passes through one."""


def find_walks(legs: Legs, places: int, lengths: FloatArray, groups: int) -> list[Walk]:
    """A basis of short traverses: closed ones, and those through control.

    `lengths` (lines,) in metres. Stepping from a free mark to what stands on it costs as much as a leg, so that figures
    keep to measured angles where they can.
    """
    control = places - 1
    occupied = np.where((legs.places == control).any(axis=1), 0.0, float(np.median(lengths)) if len(lengths) else 0.0)
    weights = np.where(legs.line >= 0, np.append(lengths, 0.0)[legs.line], occupied)
    cycles = short_cycles(legs.places, weights, places, control)
    return [_walk(legs, cycles, number, groups) for number in range(len(cycles))]


def _walk(legs: Legs, cycles: Cycles, number: int, groups: int) -> Walk:
    first, last = cycles.edges.starts[number], cycles.edges.starts[number + 1]
    edges, signs = cycles.edges.values[first:last], cycles.sign[first:last]
    steps = [_step(legs, int(edge), sign > 0, groups) for edge, sign in zip(edges, signs, strict=True)]
    bare = next((place for place, step in enumerate(steps) if step.group < 0), 0)
    return steps[bare:] + steps[:bare]


def _step(legs: Legs, edge: int, forward: bool, groups: int) -> Step:
    one, other = (0, 1) if forward else (1, 0)
    place = [int(place) if place < groups else -1 for place in legs.places[edge].tolist()]
    marks, nodes = legs.marks[edge].tolist(), legs.nodes[edge].tolist()
    turn = float(legs.turn[edge]) if forward else -float(legs.turn[edge])
    return Step(
        marks[one], marks[other], nodes[one], nodes[other], place[one], place[other], int(legs.line[edge]), turn
    )
