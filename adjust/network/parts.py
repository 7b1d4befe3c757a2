"""The parts a network falls into, and what datum each of them lacks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from adjust.arrays import BoolArray, IntArray
from adjust.job import Control, Job
from adjust.network.estimate import given_estimate
from adjust.network.plan_graph import PlanGraph, plan_graph
from adjust.network.plan_relations import PlanRelations, plan_relations
from adjust.network.sight_lines import SightLines
from adjust.network.working_plane import working_plane
from adjust.unknowns import Unknowns


@dataclass(frozen=True)
class Part:
    """Marks (indices, ascending) joined by observations, and the datum elements that nothing fixes.

    `missing` holds `east`, `north`, `height`, `rotation` and `scale`.
    """

    marks: IntArray
    missing: frozenset[str]


@dataclass(frozen=True)
class Structure:
    """What a job's observations join, and what its control holds.

    `held_plan` and `held_height` (n,) are the marks with fixed or weighted coordinates; none under inner constraints.
    """

    job: Job
    unknowns: Unknowns
    relations: PlanRelations
    graph: PlanGraph
    height_lines: IntArray
    held_plan: BoolArray
    held_height: BoolArray

    @property
    def scale_from_heights(self) -> bool:
        """Whether zenith angles meet known or levelled height differences, which gives them a scale."""
        kinds = {rows.kind for rows in self.job.observations if len(rows)}
        return "zenith" in kinds and ("height_difference" in kinds or int(np.count_nonzero(self.held_height)) > 1)


def structure_of(job: Job, unknowns: Unknowns) -> Structure:
    """The structure of a job. Raises NetworkError where its frame cannot take its observations."""
    if np.any(unknowns.sought[:, 0]):
        plane = working_plane(job)
        relations = plan_relations(job, plane, given_estimate(job, plane), SightLines(job))
    else:
        relations = _no_relations()
    held = job.marks.control != Control.FREE
    if job.datum.mode == "inner":
        held = np.zeros_like(held)
    return Structure(
        job, unknowns, relations, plan_graph(relations), _height_lines(job, unknowns), held[:, 0], held[:, 1]
    )


def datum_parts(job: Job, unknowns: Unknowns) -> tuple[Part, ...]:
    """The parts of a network and the datum elements that its observations and control leave open.

    A network that hangs together in plan and in height is one part, though no observation may join the two. Where it
    falls apart, plan parts come first, then height parts.
    """
    structure = structure_of(job, unknowns)
    plan, heights = plan_parts(structure), height_parts(structure)
    if len(plan) == len(heights) == 1:
        marks = np.union1d(plan[0].marks, heights[0].marks)
        return (Part(marks, plan[0].missing | heights[0].missing),)
    return (*plan, *heights)


def plan_parts(structure: Structure) -> tuple[Part, ...]:
    """The parts with a plan unknown, by what joins them in plan."""
    parts = []
    graph, held = structure.graph, structure.held_plan
    for marks in _pieces(structure.unknowns.sought[:, 0], graph.lines):
        inside = np.zeros(len(held), dtype=bool)
        inside[marks] = True
        points = int(np.count_nonzero(held & inside))
        missing = set() if points else {"east", "north"}
        if points < 2 and not inside[graph.northed].any():
            missing.add("rotation")
        if points < 2 and not inside[graph.measured].any() and not structure.scale_from_heights:
            missing.add("scale")
        parts.append(Part(marks, frozenset(missing)))
    return tuple(parts)


def height_parts(structure: Structure) -> tuple[Part, ...]:
    """The parts with an unknown height, by what joins them in height."""
    return tuple(
        Part(marks, frozenset() if structure.held_height[marks].any() else frozenset({"height"}))
        for marks in _pieces(structure.unknowns.sought[:, 2], structure.height_lines)
    )


def _pieces(sought: BoolArray, lines: IntArray) -> list[IntArray]:
    """Connected marks, in the order of their first, wherever at least one is sought."""
    graph = csr_array((np.ones(len(lines)), (lines[:, 0], lines[:, 1])), shape=(len(sought),) * 2)
    label = connected_components(graph, directed=False)[1]
    marks = np.nonzero(np.isin(label, label[sought]))[0]
    if not len(marks):
        return []
    order = marks[np.argsort(label[marks], kind="stable")]
    return np.split(order, np.nonzero(np.diff(label[order]))[0] + 1)


def _height_lines(job: Job, unknowns: Unknowns) -> IntArray:
    """Lines (rows, 2) of everything that determines heights, where heights are sought at all."""
    lines = [np.empty((0, 2), dtype=np.int64)]
    if not unknowns.plan_only:
        lines += [rows.marks for rows in job.observations if rows.determines_height]
    return np.vstack(lines)


def _no_relations() -> PlanRelations:
    nothing, none = np.empty(0, dtype=np.int64), np.empty(0)
    return PlanRelations(
        nothing, np.empty(0, dtype=bool), nothing, nothing, none, np.empty((0, 2), dtype=np.int64), none
    )
