"""A basis of short cycles: enough of them, each a cycle, independent, and not much longer than the shortest basis."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.spatial import Delaunay

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.short_cycles import Cycles, short_cycles

WITHIN = 1.05
"""Total length over that of a minimum basis on networks such as surveyors lay out; docs/closures.md has the study."""


@st.composite
def graphs(draw: st.DrawFn) -> tuple[int, IntArray, FloatArray]:
    """Nodes, edges and lengths; with parallel edges, edges from a node to itself, and several parts."""
    nodes = draw(st.integers(1, 12))
    node = st.integers(0, nodes - 1)
    edges = draw(st.lists(st.tuples(node, node, st.integers(0, 9)), max_size=40))
    ends = np.array([edge[:2] for edge in edges], dtype=np.int64).reshape(-1, 2)
    return nodes, ends, np.array([float(edge[2]) for edge in edges])


def incidence(cycles: Cycles, edges: int) -> IntArray:
    """How often each cycle takes each edge, mod 2."""
    taken = np.zeros((len(cycles), edges), dtype=np.int64)
    np.add.at(taken, (cycles.edges.owner, cycles.edges.values), 1)
    return taken % 2


def rank_mod_two(matrix: IntArray) -> int:
    rows = [int("".join(map(str, row)), 2) if len(row) else 0 for row in matrix.tolist()]
    rank = 0
    while rows:
        pivot = rows.pop()
        if pivot:
            rank += 1
            rows = [row ^ pivot if row ^ pivot < row else row for row in rows]
    return rank


@given(graphs())
def test_as_many_independent_cycles_as_the_graph_has(graph: tuple[int, IntArray, FloatArray]) -> None:
    nodes, ends, lengths = graph
    cycles = short_cycles(ends, lengths, nodes)
    multigraph = nx.MultiGraph(ends.tolist())
    multigraph.add_nodes_from(range(nodes))
    assert len(cycles) == len(ends) - nodes + nx.number_connected_components(multigraph)
    assert rank_mod_two(incidence(cycles, len(ends))) == len(cycles)


@given(graphs())
def test_each_is_walked_from_node_to_node_and_back(graph: tuple[int, IntArray, FloatArray]) -> None:
    nodes, ends, lengths = graph
    cycles = short_cycles(ends, lengths, nodes)
    starts = cycles.edges.starts
    for cycle in range(len(cycles)):
        steps = slice(starts[cycle], starts[cycle + 1])
        walked = ends[cycles.edges[cycle]]
        leave = np.where(cycles.sign[steps] > 0, walked[:, 0], walked[:, 1])
        arrive = np.where(cycles.sign[steps] > 0, walked[:, 1], walked[:, 0])
        assert leave.tolist() == cycles.nodes[steps].tolist()
        assert np.roll(arrive, 1).tolist() == leave.tolist()
        assert len(set(cycles.edges[cycle].tolist())) == len(walked)
        assert len(set(leave.tolist())) == len(walked)


@given(graphs(), st.integers(0, 1000))
def test_differences_of_heights_close(graph: tuple[int, IntArray, FloatArray], seed: int) -> None:
    nodes, ends, lengths = graph
    heights = np.random.default_rng(seed).integers(-1000, 1000, nodes)
    rises = heights[ends[:, 1]] - heights[ends[:, 0]]
    cycles = short_cycles(ends, lengths, nodes)
    sums = cycles.edges.total(cycles.sign * rises[cycles.edges.values])
    assert not np.any(sums)


@given(graphs())
def test_cycles_begin_where_they_are_told_to(graph: tuple[int, IntArray, FloatArray]) -> None:
    nodes, ends, lengths = graph
    cycles = short_cycles(ends, lengths, nodes, first=nodes - 1)
    for cycle in range(len(cycles)):
        on_the_way = cycles.nodes[cycles.edges.starts[cycle] : cycles.edges.starts[cycle + 1]].tolist()
        assert on_the_way[0] == (nodes - 1 if nodes - 1 in on_the_way else min(on_the_way))


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("kept", [0.6, 0.8, 1.0])
def test_not_much_longer_than_a_minimum_basis(seed: int, kept: float) -> None:
    """Against networkx's exact basis (Kavitha et al. 2008), on marks joined as a triangulation with lines left out."""
    generator = np.random.default_rng(seed)
    places = generator.uniform(0.0, 1000.0, (40, 2))
    triangles = Delaunay(places).simplices
    sides = np.unique(np.sort(np.vstack([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [0, 2]]])), axis=0)
    ends = sides[generator.random(len(sides)) < kept].astype(np.int64)
    lengths = np.hypot(*(places[ends[:, 1]] - places[ends[:, 0]]).T)
    graph = nx.Graph()
    weighted = zip(ends.tolist(), lengths.tolist(), strict=True)
    graph.add_weighted_edges_from((one, other, length) for (one, other), length in weighted)
    minimum = sum(
        graph.edges[step]["weight"]
        for cycle in nx.minimum_cycle_basis(graph, weight="weight")
        for step in zip(cycle, [*cycle[1:], cycle[0]], strict=True)
    )
    cycles = short_cycles(ends, lengths, len(places))
    assert minimum * (1 - 1e-9) <= lengths[cycles.edges.values].sum() <= minimum * WITHIN
