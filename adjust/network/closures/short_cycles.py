"""A basis of short cycles of a graph, quick on networks of any size.

Edges are put in one by one, nearest part of the graph first; one that joins marks already joined closes a cycle with
the shortest way through what is there. Each cycle has an edge that no earlier one has, so they are independent, and
there are as many as a basis holds: edges − nodes + parts. A basis made edge by edge like this is weakly fundamental
(Liebchen & Rizzi 2007, *Discrete Applied Mathematics* 155); on survey networks its total length lies within a few per
cent of the minimum (docs/closures.md), which for ten thousand marks would take hours to find.
"""

from __future__ import annotations

import heapq
import math
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.ragged import Ragged

Neighbours = list[dict[int, tuple[float, int]]]
"""For each node its neighbours: length and number of the shortest edge there."""


@dataclass(frozen=True)
class Cycles:
    """Closed walks. `edges` are the edges of each, in the order walked; `sign` (steps,) is +1 where an edge is walked
    from its first end to its second; `nodes` (steps,) is where each step begins."""

    edges: Ragged
    sign: FloatArray
    nodes: IntArray

    def __len__(self) -> int:
        return len(self.edges)

    def take(self, cycles: IntArray) -> Cycles:
        """A choice of the cycles."""
        places = Ragged(np.arange(len(self.sign)), self.edges.starts).take(cycles).values
        return Cycles(self.edges.take(cycles), self.sign[places], self.nodes[places])


def short_cycles(ends: IntArray, lengths: FloatArray, nodes: int, first: int | None = None) -> Cycles:
    """A basis of short cycles of the graph with edges between `ends` (edges, 2) of positive or zero `lengths` (edges,).

    Parallel edges and edges from a node to itself are welcome. A cycle begins at the node `first` where it passes
    through it, else at its lowest node.
    """
    walks = _Growth(ends, lengths, nodes).walks()
    steps: list[list[int]] = []
    started: list[int] = []
    pairs = ends.tolist()
    for walk in walks:
        turned, begin = _turned(walk, pairs, first)
        steps.append(turned)
        started.append(begin)
    edges = Ragged.of(steps)
    sign, at = _walked(edges, started, pairs)
    return Cycles(edges, sign, at)


class _Growth:
    """A graph that grows edge by edge."""

    def __init__(self, ends: IntArray, lengths: FloatArray, nodes: int) -> None:
        self.ends, self.lengths, self.nodes = ends, lengths, nodes
        self.neighbours: Neighbours = [{} for _ in range(nodes)]

    def walks(self) -> list[list[int]]:
        """The edges of each cycle in walking order."""
        found: list[list[int]] = []
        pairs, lengths = self.ends.tolist(), self.lengths.tolist()
        for edge in self._sequence().tolist():
            one, other = pairs[edge]
            if one == other:
                found.append([edge])
                continue
            way = shortest_way(self.neighbours, one, other)
            if way is not None:
                found.append([*way, edge])
            self._put_in(edge, one, other, lengths[edge])
        return found

    def _put_in(self, edge: int, one: int, other: int, length: float) -> None:
        present = self.neighbours[one].get(other)
        if present is None or length < present[0]:
            self.neighbours[one][other] = self.neighbours[other][one] = (length, edge)

    def _sequence(self) -> IntArray:
        """Edges in the order in which a circle that grows about the lowest node of each part takes in both their
        ends."""
        order = self._order_of_nodes()[self.ends]
        return np.lexsort((self.lengths, order.min(axis=1), order.max(axis=1)))

    def _order_of_nodes(self) -> IntArray:
        around: list[list[tuple[int, float]]] = [[] for _ in range(self.nodes)]
        for (one, other), length in zip(self.ends.tolist(), self.lengths.tolist(), strict=True):
            around[one].append((other, length))
            around[other].append((one, length))
        order = np.full(self.nodes, -1, dtype=np.int64)
        reached = 0
        for seed in range(self.nodes):
            front = [(0.0, seed)] if order[seed] < 0 else []
            while front:
                distance, node = heapq.heappop(front)
                if order[node] >= 0:
                    continue
                order[node], reached = reached, reached + 1
                for neighbour, length in around[node]:
                    if order[neighbour] < 0:
                        heapq.heappush(front, (distance + length, neighbour))
        return order


def shortest_way(neighbours: Neighbours, start: int, end: int) -> list[int] | None:
    """Edges of the shortest way between two nodes, searched from both (Dijkstra 1959, Nicholson 1966); None if there
    is none."""
    distance: tuple[dict[int, float], dict[int, float]] = ({start: 0.0}, {end: 0.0})
    before: tuple[dict[int, tuple[int, int]], dict[int, tuple[int, int]]] = ({}, {})
    front: tuple[list[tuple[float, int]], list[tuple[float, int]]] = ([(0.0, start)], [(0.0, end)])
    best, meeting = math.inf, -1
    while front[0] and front[1] and front[0][0][0] + front[1][0][0] < best:
        side = 0 if front[0][0][0] <= front[1][0][0] else 1
        reached, node = heapq.heappop(front[side])
        if reached > distance[side][node]:
            continue
        for neighbour, (length, edge) in neighbours[node].items():
            longer = reached + length
            if longer >= best or longer >= distance[side].get(neighbour, math.inf):
                continue
            distance[side][neighbour], before[side][neighbour] = longer, (node, edge)
            heapq.heappush(front[side], (longer, neighbour))
            whole = longer + distance[1 - side].get(neighbour, math.inf)
            if whole < best:
                best, meeting = whole, neighbour
    return None if meeting < 0 else [*_back(before[0], meeting)[::-1], *_back(before[1], meeting)]


def _back(before: dict[int, tuple[int, int]], node: int) -> list[int]:
    edges = []
    while node in before:
        node, edge = before[node]
        edges.append(edge)
    return edges


def _turned(walk: list[int], ends: list[list[int]], first: int | None) -> tuple[list[int], int]:
    """The same cycle, begun at `first` or its lowest node and walked towards the lower of its two neighbours."""
    nodes = _nodes(walk, ends)
    begin = first if first in nodes else min(nodes)
    place = nodes.index(begin)
    ahead, behind = walk[place:] + walk[:place], (walk[place:] + walk[:place])[::-1]
    towards = nodes[(place + 1) % len(nodes)], nodes[place - 1]
    return (ahead if (towards[0], ahead) <= (towards[1], behind) else behind), begin


def _nodes(walk: list[int], ends: list[list[int]]) -> list[int]:
    """Where each step of a closed walk begins."""
    if len(walk) == 1:
        return [ends[walk[0]][0]]
    one, other = ends[walk[0]]
    if len(walk) == 2:
        return [one, other]
    node = one if other in ends[walk[1]] else other
    nodes = []
    for edge in walk:
        nodes.append(node)
        node = ends[edge][0] + ends[edge][1] - node
    return nodes


def _walked(edges: Ragged, started: list[int], ends: list[list[int]]) -> tuple[FloatArray, IntArray]:
    sign, nodes = np.empty(len(edges.values)), np.empty(len(edges.values), dtype=np.int64)
    place = 0
    for begin, count in zip(started, edges.lengths.tolist(), strict=True):
        node = begin
        for edge in edges.values[place : place + count].tolist():
            one, other = ends[edge]
            sign[place], nodes[place] = (1.0 if node == one else -1.0), node
            node, place = one + other - node, place + 1
    return sign, nodes
