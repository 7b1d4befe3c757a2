"""Where marks lie on the drawing: by their plan coordinates, or, where a job has none, by who is joined to whom."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray, IntArray
from adjust.reports.records import known_coordinates

WIDTH = 1000.0
"""Units across the drawing; one unit is about one point of a page."""
LOWEST, HIGHEST = 400.0, 640.0
"""Units from top to bottom: neither a ribbon nor a tower."""
MARGIN = 60.0
"""Units left free around the marks, for labels and ellipses."""
EARTH_RADIUS = 6_371_000.0
SPRUNG = 300
"""Marks up to which the schematic is laid out by the distances along the graph, whose cost is cubic; beyond, by steps
from the first mark."""


@dataclass(frozen=True)
class Places:
    """Positions (n, 2) in units of the drawing, x right and y down, NaN for marks that are not on it.

    `metres` is the length of one unit, None in a schematic; `origin` east and north of the drawing's upper left corner.
    """

    positions: FloatArray
    height: float
    metres: float | None
    origin: tuple[float, float]

    @property
    def drawn(self) -> IntArray:
        """The marks on the drawing."""
        return np.flatnonzero(np.isfinite(self.positions).all(axis=1))


def find_places(adjustment: Adjustment) -> Places:
    """The drawing's places for all marks."""
    plan = _plan(adjustment)
    if np.isfinite(plan).all(axis=1).any():
        return _fitted(plan, drawn_to_scale=True)
    return _fitted(_schematic(adjustment), drawn_to_scale=False)


def _plan(adjustment: Adjustment) -> FloatArray:
    """East and north (n, 2), metres: of the grid, or about the mean position where the CRS is geographic."""
    coordinates, frame = known_coordinates(adjustment), adjustment.job.frame
    grid = frame.grid_coordinates(coordinates)[:, :2]
    if np.isfinite(grid).any():
        return grid
    geographic = frame.geographic(coordinates)[:, :2]
    if not np.isfinite(geographic).any():
        return grid
    middle = np.nanmean(geographic, axis=0)
    local: FloatArray = (geographic - middle) * EARTH_RADIUS * np.array([np.cos(middle[1]), 1.0])
    return local


def _fitted(plan: FloatArray, *, drawn_to_scale: bool) -> Places:
    """Turned to y down, shifted and scaled alike in both directions to fill the drawing."""
    if len(plan) == 0 or not np.isfinite(plan).any():
        return Places(np.full((len(plan), 2), np.nan), LOWEST, None, (0.0, 0.0))
    low, high = np.nanmin(plan, axis=0), np.nanmax(plan, axis=0)
    extent = np.maximum(high - low, 1e-9)
    inner = WIDTH - 2 * MARGIN
    height = float(np.clip(inner * extent[1] / extent[0], LOWEST - 2 * MARGIN, HIGHEST - 2 * MARGIN)) + 2 * MARGIN
    scale = float(min(inner / extent[0], (height - 2 * MARGIN) / extent[1]))
    if len(plan) == 1 or not np.any(high > low):
        scale = 1.0
    middle, centre = (low + high) / 2, np.array([WIDTH, height]) / 2
    positions = centre + (plan - middle) * scale * np.array([1.0, -1.0])
    origin = middle + (np.array([0.0, 0.0]) - centre) / scale * np.array([1.0, -1.0])
    return Places(positions, height, 1 / scale if drawn_to_scale else None, (float(origin[0]), float(origin[1])))


def _schematic(adjustment: Adjustment) -> FloatArray:
    """Places from the graph of observed lines, its parts side by side."""
    import networkx

    graph = networkx.Graph()
    graph.add_nodes_from(range(len(adjustment.job.marks)))
    graph.add_edges_from(adjustment.lines.tolist())
    plan, right = np.full((len(adjustment.job.marks), 2), np.nan), 0.0
    for part in sorted(networkx.connected_components(graph), key=lambda marks: (-len(marks), min(marks))):
        marks = sorted(part)
        laid = _part_places(graph.subgraph(marks), marks)
        laid -= laid.min(axis=0)
        plan[marks] = laid + np.array([right, 0.0])
        right += float(laid[:, 0].max()) + 1.0
    return plan


def _part_places(graph: object, marks: list[int]) -> FloatArray:
    """Places (marks, 2) of one connected part, in steps of the graph."""
    import networkx

    if len(marks) == 1:
        return np.zeros((1, 2))
    if len(marks) <= SPRUNG:
        ordered = networkx.Graph()
        ordered.add_nodes_from(marks)
        ordered.add_edges_from(sorted(tuple(sorted(edge)) for edge in graph.edges))  # type: ignore[attr-defined]
        laid = networkx.kamada_kawai_layout(ordered, scale=max(1.0, len(marks) ** 0.5 / 2))
    else:
        steps = networkx.single_source_shortest_path_length(graph, marks[0])
        layered = networkx.Graph()
        layered.add_nodes_from((mark, {"subset": steps[mark]}) for mark in marks)
        laid = networkx.multipartite_layout(layered, scale=len(marks) ** 0.5)
    return np.array([laid[mark] for mark in marks], dtype=float)
