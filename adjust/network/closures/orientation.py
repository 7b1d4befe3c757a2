"""Orientations carried from station to station along lines sighted from both ends, and from known directions."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.angles import wrapped
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import PlaneFrame
from adjust.network.closures.closures import Closures
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.stations import Stations
from adjust.observations.direction import azimuth_of
from adjust.tolerances import Quantity


@dataclass(frozen=True)
class Tie:
    """What orients a group: `node` (groups,) of the group stands for the known `azimuth` (groups,); −1: nothing does.

    `to` (groups,) is the control mark sighted, −1 where azimuths were observed. `variance` (groups,) is that of the
    azimuth from weighted control.
    """

    node: IntArray
    azimuth: FloatArray
    to: IntArray
    variance: FloatArray


class Orientations:
    """How the orientations of groups of readings hang together.

    `lines` (lines, 2) are nodes of the two sights of each line that is sighted from both ends; the group of the second
    is oriented by that of the first plus `turn` (lines,), radians. In an ellipsoid frame the meridians' convergence is
    in it, and lines between marks without coordinates are left out. The orientation of a group is the azimuth of its
    zero.
    """

    def __init__(self, observed: Observed, stations: Stations) -> None:
        self.observed, self.stations = observed, stations
        sights = stations.readings.sights
        back = stations.sight(sights[:, ::-1])
        one = np.flatnonzero((back >= 0) & (sights[:, 0] < sights[:, 1]))
        convergence = self._convergence(sights[one])
        usable = np.isfinite(convergence)
        self.lines: IntArray = np.column_stack([one, back[one]])[usable]
        reading = stations.reading[self.lines]
        self.turn = reading[:, 0] - reading[:, 1] + np.pi + convergence[usable]
        self.marks: IntArray = sights[self.lines[:, 0]]

    def _convergence(self, sights: IntArray) -> FloatArray:
        """The azimuth back minus the azimuth out minus half a turn (lines,), radians; 0 in a plane."""
        geometry = self.observed.geometry
        if isinstance(geometry.frame, PlaneFrame):
            return np.zeros(len(sights))
        out, back = (azimuth_of(geometry.sight(*pair, plumb=True).enu) for pair in (sights.T, sights[:, ::-1].T))
        return wrapped(back - out - np.pi)

    @cached_property
    def control_sights(self) -> tuple[IntArray, FloatArray, FloatArray]:
        """Sights from one mark held in plan to another: their nodes, known azimuths and the azimuths' variances."""
        observed, sights = self.observed, self.stations.readings.sights
        nodes = np.flatnonzero(observed.held[sights, 0].all(axis=1))
        at, to = sights[nodes].T
        enu = observed.geometry.sight(at, to, plumb=True).enu
        across = observed.control_variance[:, :2].max(axis=1)
        variance = (across[at] + across[to]) / np.maximum(np.sum(enu[:, :2] ** 2, axis=1), np.finfo(float).tiny)
        return nodes, azimuth_of(enu), variance

    @cached_property
    def tie(self) -> Tie:
        """Azimuths orient a group before known coordinates do, and of those the first control mark sighted."""
        stations = self.stations
        nodes, azimuth, variance = self.control_sights
        node = stations.north.copy()
        known, to, spread = np.zeros(len(node)), np.full(len(node), -1, dtype=np.int64), np.zeros(len(node))
        groups, first = np.unique(stations.group[nodes], return_index=True)
        by_control = node[groups] < 0
        groups, first = groups[by_control], first[by_control]
        node[groups], known[groups], spread[groups] = nodes[first], azimuth[first], variance[first]
        to[groups] = stations.readings.sights[nodes[first], 1]
        return Tie(node, known, to, spread)

    @cached_property
    def oriented(self) -> BoolArray:
        """Groups (groups,) whose orientation is known."""
        return self.tie.node >= 0

    @cached_property
    def orientation(self) -> FloatArray:
        """Orientations (groups,) by their ties, radians; 0 where there is none."""
        tie = self.tie
        return np.where(self.oriented, tie.azimuth - self.stations.reading[np.maximum(tie.node, 0)], 0.0)


def control_orientation_closures(observed: Observed, orientations: Orientations) -> Closures:
    """Every further control mark that a station sights, against the one that orients it.

    Misclosure: the angle observed between them minus that of their coordinates.
    """
    stations, tie = orientations.stations, orientations.tie
    nodes, azimuth, variance = orientations.control_sights
    group = stations.group[nodes]
    further = nodes != tie.node[group]
    nodes, azimuth, variance, group = nodes[further], azimuth[further], variance[further], group[further]
    observed_angle = stations.reading[nodes] - stations.reading[tie.node[group]]
    misclosure = wrapped(observed_angle - (azimuth - tie.azimuth[group]))
    edges = stations.ways(tie.node[group], nodes)
    rows = Ragged(stations.readings.rows[edges.values], edges.starts)
    spread = rows.total(observed.sd[rows.values] ** 2) + variance + tie.variance[group]
    at, to = stations.readings.sights[nodes].T
    triples = zip(tie.to[group].tolist(), at.tolist(), to.tolist(), strict=True)
    marks = Ragged.of([[mark for mark in triple if mark >= 0] for triple in triples])
    return Closures(
        "orientation",
        "rad",
        misclosure[:, None],
        np.sqrt(spread)[:, None],
        marks,
        rows,
        np.full(len(rows), np.nan),
        np.full(len(rows), 1, dtype=np.int64),
        Quantity.STATION,
    )
