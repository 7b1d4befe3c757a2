"""Marks that too few observations touch, whatever the geometry."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, IntArray
from adjust.network.parts import Structure
from adjust.network.plan_graph import useful_rays
from adjust.network.plan_relations import PlanRelations

NEEDED = 2
"""Plan coordinates of a mark: it takes as many observations to fix it."""


@dataclass(frozen=True)
class Tally:
    """What touches each mark (n,): sights to it, sights from it beyond those that orient its rounds, distances."""

    seen: IntArray
    seeing: IntArray
    distances: IntArray

    @property
    def total(self) -> IntArray:
        """Observations that bear on each mark."""
        return self.seen + self.seeing + self.distances


def undetermined(structure: Structure) -> dict[str, list[int]]:
    """Marks that cannot be determined in plan, by the reason in words.

    A mark with fewer observations than coordinates is left out with all that touches it, and the rest counted again:
    what hangs on it falls with it.
    """
    relations = structure.relations
    sought = structure.unknowns.sought[:, 0] & ~structure.held_plan
    standing = np.ones(len(sought), dtype=bool)
    reasons: dict[str, list[int]] = {}
    while True:
        tally = _tally(relations, standing)
        failing = np.nonzero(sought & standing & (tally.total < NEEDED))[0]
        if not len(failing):
            return reasons
        for mark in failing.tolist():
            reasons.setdefault(_reason(tally, mark), []).append(mark)
        standing[failing] = False


def _tally(relations: PlanRelations, standing: BoolArray) -> Tally:
    """Count among the marks still standing. A line that knows north counts once, from whichever end it was observed."""
    count = len(standing)
    station, target = relations.station[relations.round], relations.target
    rays = useful_rays(relations, standing[station] & standing[target])
    free, northed = rays & ~relations.northed[relations.round], rays & relations.northed[relations.round]
    one, other = np.minimum(station, target)[northed], np.maximum(station, target)[northed]
    lines = np.unique(one * count + other)
    ends = relations.ends[standing[relations.ends].all(axis=1)]
    rounds = relations.station[np.unique(relations.round[free])]
    return Tally(
        np.bincount(target[free], minlength=count)
        + np.bincount(np.concatenate([lines // count, lines % count]), minlength=count),
        np.bincount(station[free], minlength=count) - np.bincount(rounds, minlength=count),
        np.bincount(ends.ravel(), minlength=count),
    )


def _reason(tally: Tally, mark: int) -> str:
    if tally.seen[mark]:
        return "seen by one direction only: needs a second direction or a distance"
    if tally.seeing[mark]:
        return "sees only two marks that can be determined: needs a third one, a direction to it, or a distance"
    if tally.distances[mark]:
        return "one distance only: needs a second one, or a direction"
    return "nothing that observes it helps to determine it: needs two directions, two distances, or one of each"
