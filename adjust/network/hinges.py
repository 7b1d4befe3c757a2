"""Figures that hang on the rest of a network by one mark and can turn about it, or grow from it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, IntArray
from adjust.network.blocks import Blocks, find_blocks
from adjust.network.parts import Structure


@dataclass(frozen=True)
class Hinge:
    """Marks that can move about `mark`, and whether they can turn or grow."""

    mark: int
    moving: IntArray
    turns: bool
    grows: bool


def find_hinges(structure: Structure) -> list[Hinge]:
    """The hinges of a network whose parts have control in plan, or of a free network.

    A block of the graph is held by its own control and by each mark through which it reaches control elsewhere. Two
    such points hold it; with one it needs an azimuth not to turn and a distance not to grow. In a free network the
    block that knows most stands for control.
    """
    graph = structure.graph
    blocks = find_blocks(len(structure.held_plan), graph.lines)
    members = blocks.members()
    northed = _marked(blocks, graph.northed)
    measured = _marked(blocks, graph.measured) | structure.scale_from_heights
    held = structure.held_plan
    if structure.job.datum.mode == "inner" and members:
        anchor = max(members, key=lambda top: (northed[top], measured[top], len(members[top])))
        held = held.copy()
        held[[anchor, blocks.parent[anchor]]] = True
    points = _holding_points(blocks, members, held)
    return [
        Hinge(points[top][0], _others(blocks, members, top, points[top][0]), not northed[top], not measured[top])
        for top in members
        if len(points[top]) == 1 and not (northed[top] and measured[top])
    ]


def _marked(blocks: Blocks, lines: IntArray) -> BoolArray:
    """Which blocks (n,), by their top mark, contain one of the lines (rows, 2)."""
    marked = np.zeros(len(blocks.block), dtype=bool)
    marked[blocks.of_lines(lines)] = True
    return marked


def _others(blocks: Blocks, members: dict[int, IntArray], top: int, hinge: int) -> IntArray:
    marks = np.append(members[top], blocks.parent[top])
    others: IntArray = np.sort(marks[marks != hinge])
    return others


def _holding_points(blocks: Blocks, members: dict[int, IntArray], held: BoolArray) -> dict[int, list[int]]:
    """The marks of each block, by its top, that are held or through which it reaches a held mark elsewhere."""
    below = np.zeros(len(held), dtype=np.int64)
    inside = {}
    for top in blocks.tops.tolist():
        inside[top] = int(np.sum(held[members[top]] + below[members[top]]))
        below[blocks.parent[top]] += inside[top]
    total = np.bincount(blocks.piece, weights=held)
    points = {}
    for top, marks in members.items():
        points[top] = marks[held[marks] | (below[marks] > 0)].tolist()
        if total[blocks.piece[top]] > inside[top]:
            points[top].append(int(blocks.parent[top]))
    return points
