"""The dissection: no row joins two branches, and the parts are balanced with small separators."""

import networkx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from adjust.solver.dissection import LEAF_COLUMNS, Level, dissect, smallest_cover
from tests.benchmarks.grid import grid_problem, grid_sides


def joined_branches(node, pairs):
    """Pairs whose nodes lie on different branches of the tree."""
    low, high = np.sort(node[pairs], axis=1).T
    steps = np.frexp(high.astype(float))[1] - np.frexp(low.astype(float))[1]
    return pairs[(high >> steps) != low]


@settings(max_examples=60, deadline=None)
@given(
    seed=st.integers(0, 2**32 - 1),
    groups=st.integers(1, 400),
    density=st.floats(0.0, 4.0),
    unknown=st.sampled_from([0.0, 0.1, 1.0]),
)
def test_no_pair_joins_two_branches(seed, groups, density, unknown):
    generator = np.random.default_rng(seed)
    pairs = generator.integers(0, groups, (int(density * groups), 2))
    sizes = generator.integers(0, 4, groups) * generator.choice([1, 1, 1, 30], groups)
    pairs = np.sort(pairs[(pairs[:, 0] != pairs[:, 1]) & (sizes[pairs] > 0).all(axis=1)], axis=1)
    positions = generator.uniform(size=(groups, 2))
    positions[generator.uniform(size=groups) < unknown] = np.nan
    tied = generator.uniform(size=groups) < 0.02
    node = dissect(pairs, sizes, positions, tied)
    assert len(joined_branches(node, pairs)) == 0
    np.testing.assert_array_equal(node > 0, sizes > 0)
    np.testing.assert_array_equal(node[tied & (sizes > 0)], 1)


@pytest.mark.parametrize("known", [True, False])
def test_a_grid_is_cut_by_about_one_line_of_marks(known):
    width = 40
    positions = grid_problem(width**2).positions if known else None
    node = dissect(grid_sides(width, width), np.full(width**2, 3), positions, np.zeros(width**2, dtype=bool))
    root = np.count_nonzero(node == 1)
    assert root <= (width if known else 1.6 * width)  # breadth-first cuts run aslant
    depth = np.frexp(node.astype(float))[1]
    assert depth.max() <= 2 + np.log(3 * width**2 / LEAF_COLUMNS) / np.log(4 / 3)  # a part is at most 3/4 of the whole


def test_a_chain_is_cut_in_two_at_single_marks():
    marks = 3000
    pairs = np.column_stack([np.arange(marks - 1), np.arange(1, marks)])
    shuffled = np.random.default_rng(2).permutation(marks)
    node = dissect(shuffled[pairs], np.ones(marks, dtype=int), None, np.zeros(marks, dtype=bool))
    used, sizes = np.unique(node, return_counts=True)
    inner = np.isin(2 * used, used)
    np.testing.assert_array_equal(sizes[inner], 1)


def test_unconnected_parts_need_no_separator():
    pairs = np.concatenate([np.column_stack([np.arange(29), np.arange(1, 30)]) + 30 * part for part in range(8)])
    node = dissect(pairs, np.full(240, 2), None, np.zeros(240, dtype=bool))
    part = np.arange(240) // 30
    for branch in (2, 3):
        inside = (node >> (np.frexp(node.astype(float))[1] - 2)) == branch
        assert len(set(part[inside])) >= 3
    assert np.count_nonzero(node == 1) <= 1


def test_marks_tied_to_far_hubs_are_cut_at_the_hubs():
    marks, hubs = 600, 6
    generator = np.random.default_rng(4)
    positions = generator.uniform(size=(marks, 2))
    pairs = np.array([(hub, mark) for mark in range(hubs, marks) for hub in generator.choice(hubs, 2, replace=False)])
    node = dissect(pairs, np.full(marks, 3), positions, np.zeros(marks, dtype=bool))
    np.testing.assert_array_equal(np.flatnonzero(node == 1), np.arange(hubs))


@settings(max_examples=60, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), members=st.integers(2, 40), density=st.floats(0.1, 3.0))
def test_a_cover_touches_every_pair_across_and_is_as_small_as_the_largest_matching(seed, members, density):
    generator = np.random.default_rng(seed)
    ends = generator.integers(0, members, (int(density * members), 2))
    ends = np.unique(ends[ends[:, 0] != ends[:, 1]], axis=0)
    above = generator.uniform(size=members) < 0.5
    one_part = np.zeros(members, dtype=np.int64)
    cover = smallest_cover(Level(np.arange(members), one_part, 1, ends, one_part + 1), above)
    across = ends[above[ends[:, 0]] != above[ends[:, 1]]]
    assert cover[across].any(axis=1).all()
    graph = networkx.Graph(across.tolist())
    matching = networkx.bipartite.maximum_matching(graph, top_nodes=set(graph) & set(np.flatnonzero(above)))
    assert np.count_nonzero(cover) == len(matching) // 2  # Kőnig's theorem: no cover is smaller
