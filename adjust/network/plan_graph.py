"""Which marks the plan observations join, and with what: for datum, hinges and counting."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, IntArray
from adjust.network.plan_relations import PlanRelations


@dataclass(frozen=True)
class PlanGraph:
    """Lines between marks (rows, 2): every line, those whose azimuth and those whose length is observed.

    A round is drawn as a ring through its station and its targets, as no single mark can be taken out of it so that the
    rest falls apart: they share its orientation.
    """

    lines: IntArray
    northed: IntArray
    measured: IntArray


def plan_graph(relations: PlanRelations) -> PlanGraph:
    """The graph of what can fix something: a round with one target that does not know north is left out."""
    useful = useful_rays(relations, np.ones(len(relations.round), dtype=bool))
    station, target = relations.station[relations.round], relations.target
    northed = useful & relations.northed[relations.round]
    lines = np.vstack([_rings(relations, useful), relations.ends])
    return PlanGraph(lines, np.column_stack([station, target])[northed], relations.ends)


def useful_rays(relations: PlanRelations, active: BoolArray) -> BoolArray:
    """Which of the `active` rays (rays,) tell something: those from north, and those with another ray to compare."""
    count = np.bincount(relations.round[active], minlength=len(relations.station))
    useful: BoolArray = active & (relations.northed | (count > 1))[relations.round]
    return useful


def _rings(relations: PlanRelations, useful: BoolArray) -> IntArray:
    """Lines (rows, 2) from each station to its first target, on from target to target, and back."""
    number, target = relations.round[useful], relations.target[useful]
    station = relations.station[number]
    if not len(number):
        return np.empty((0, 2), dtype=np.int64)
    first = np.concatenate([[True], number[1:] != number[:-1]])
    last = np.concatenate([number[1:] != number[:-1], [True]])
    before = np.where(first, station, np.roll(target, 1))
    closing = np.column_stack([target[last], station[last]])
    return np.vstack([np.column_stack([before, target]), closing])
