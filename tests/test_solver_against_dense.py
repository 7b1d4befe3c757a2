"""The sparse solver against dense linear algebra on random systems of every shape."""

import numpy as np
import pytest
import scipy.sparse
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.sparse.csgraph import connected_components

from adjust.solver import analyse
from adjust.solver.workers import one_blas_thread
from tests.sparse_problems import Problem, network

ROUNDING = 2e-14
"""Share of the largest figure per unit of condition number: some tens of roundings of 2.2e-16 each."""

PROBLEMS = {
    "one front": network(3, seed=1),
    "eighty marks": network(80, seed=2),
    "no positions": network(80, seed=3, positions=False),
    "three parts": network(90, seed=4, parts=3),
    "long sides": network(80, seed=5, long_sides=120),
    "common columns": network(80, seed=6, common=3),
    "columns of any scale": network(80, seed=7, spread=8.0),
    "all at once": network(120, seed=8, parts=4, long_sides=60, common=2, spread=6.0),
}


@pytest.fixture(autouse=True)
def _one_thread_for_dense_algebra():
    with one_blas_thread():
        yield


@pytest.fixture(params=PROBLEMS, name="problem")
def _problem(request):
    return PROBLEMS[request.param]


def assert_agrees(problem: Problem, factor) -> None:
    """Solution, covariance, row variances and inverse products, in scaled columns."""
    atol = ROUNDING * problem.condition
    largest = np.abs(problem.scaled_solution).max()
    np.testing.assert_allclose(factor.solution * problem.norms, problem.scaled_solution, rtol=0, atol=atol * largest)
    first, second = problem.sharing
    selected = factor.selected_covariance(first, second)
    entries = selected.entries * problem.norms[first] * problem.norms[second]
    largest = np.abs(problem.scaled_covariance).max()
    np.testing.assert_allclose(entries, problem.scaled_covariance[first, second], rtol=0, atol=atol * largest)
    np.testing.assert_allclose(selected.row_variances, problem.leverage, rtol=0, atol=1e-8)  # of 1: LOSS and margin
    block = np.random.default_rng(0).standard_normal((len(problem.norms), 2))
    found = factor.normal_solve(block * problem.norms[:, None]) * problem.norms[:, None]
    np.testing.assert_allclose(found, problem.scaled_covariance @ block, rtol=0, atol=10 * atol * largest)


def test_everything_agrees_with_dense_algebra(problem):
    assert_agrees(problem, problem.factor())


def test_row_variances_sum_to_the_number_of_columns(problem):
    nothing = np.empty(0, dtype=np.int64)
    total = problem.factor().selected_covariance(nothing, nothing).row_variances.sum()
    np.testing.assert_allclose(total, problem.dense.shape[1], rtol=0, atol=1e-8)


def test_condition_number_is_that_of_the_scaled_columns(problem):
    np.testing.assert_allclose(problem.factor().condition_number(), problem.condition, rtol=1e-3)  # printed to 3 digits


def test_second_opinion_agrees(problem):
    factor = problem.factor()
    opinion = factor.second_opinion()
    largest = np.abs(problem.scaled_solution).max()
    atol = ROUNDING * problem.condition * largest
    np.testing.assert_allclose(opinion.solution * problem.norms, problem.scaled_solution, rtol=0, atol=atol)
    assert opinion.largest_gap == np.abs(opinion.solution - factor.solution).max()
    assert 1 <= opinion.iterations <= 10


def test_a_matrix_of_the_same_pattern_needs_no_new_analysis(problem):
    generator = np.random.default_rng(11)
    analysis = analyse(problem.matrix, problem.groups, problem.positions)
    other = problem.matrix.copy()
    other.data = generator.standard_normal(len(other.data))
    right = generator.standard_normal(len(problem.right_side))
    again, fresh = (a.factorise(other, right) for a in (analysis, analyse(other, problem.groups, problem.positions)))
    np.testing.assert_array_equal(again.solution, fresh.solution)
    first, second = problem.sharing
    one, two = (f.selected_covariance(first, second) for f in (again, fresh))
    np.testing.assert_array_equal(one.entries, two.entries)
    np.testing.assert_array_equal(one.row_variances, two.row_variances)


def test_another_pattern_is_refused():
    problem = PROBLEMS["eighty marks"]
    analysis = analyse(problem.matrix, problem.groups, problem.positions)
    with pytest.raises(ValueError, match="another pattern"):
        analysis.factorise(scipy.sparse.csr_array(problem.dense[::-1]), problem.right_side)


def test_a_pair_that_shares_nothing_is_refused():
    problem = PROBLEMS["three parts"]
    graph = scipy.sparse.csr_array((problem.dense != 0).astype(float))
    part = connected_components(graph.T @ graph)[1]
    stranger = np.flatnonzero(part != part[0])[0]
    with pytest.raises(ValueError, match="neither a row nor a group"):
        problem.factor().selected_covariance(np.array([0]), np.array([stranger]))


def test_two_runs_give_the_same_bytes(problem):
    one, two = problem.factor(), problem.factor()
    assert one.solution.tobytes() == two.solution.tobytes()
    first, second = problem.sharing
    assert one.selected_covariance(first, second).entries.tobytes() == (
        two.selected_covariance(first, second).entries.tobytes()
    )


def test_rows_without_elements_and_groups_without_columns_change_nothing():
    problem = PROBLEMS["eighty marks"]
    dense = np.insert(problem.dense, [0, 7, 7, len(problem.dense)], 0.0, axis=0)
    right = np.insert(problem.right_side, [0, 7, 7, len(problem.dense)], 5.0)
    positions = np.full((3 * len(problem.positions), 2), np.nan)
    positions[::3] = problem.positions
    sparse = Problem(dense, right, 3 * problem.groups, positions)
    assert_agrees(sparse, sparse.factor())
    nothing = np.empty(0, dtype=np.int64)
    variances = sparse.factor().selected_covariance(nothing, nothing).row_variances
    np.testing.assert_array_equal(variances[[0, 8, 9, -1]], 0.0)


def test_elements_that_happen_to_be_zero_keep_their_place():
    problem = PROBLEMS["eighty marks"]
    matrix = problem.matrix.copy()
    matrix.data[::7] = 0.0
    sparse = Problem(matrix.toarray(), problem.right_side, problem.groups, problem.positions)
    analysis = analyse(problem.matrix, problem.groups, problem.positions)
    assert_agrees(sparse, analysis.factorise(matrix, problem.right_side))


def test_nothing_to_solve_for():
    empty = scipy.sparse.csr_array((3, 0))
    factor = analyse(empty, np.empty(0, dtype=np.int64)).factorise(empty, np.ones(3))
    nothing = np.empty(0, dtype=np.int64)
    assert factor.solution.shape == (0,)
    np.testing.assert_array_equal(factor.selected_covariance(nothing, nothing).row_variances, np.zeros(3))


@settings(max_examples=25, deadline=None)
@given(
    seed=st.integers(0, 2**32 - 1),
    marks=st.integers(1, 60),
    parts=st.integers(1, 5),
    long_sides=st.integers(0, 60),
    common=st.integers(0, 2),
    unknown=st.sampled_from([0.0, 0.2, 1.0]),
)
def test_any_graph_is_solved(seed, marks, parts, long_sides, common, unknown):
    problem = network(marks, seed=seed, parts=parts, long_sides=long_sides, common=common, spread=3.0)
    generator = np.random.default_rng(seed)
    held = held_by_unit_rows(problem, generator)
    held.positions[generator.uniform(size=len(held.positions)) < unknown] = np.nan
    assert_agrees(held, held.factor())


def held_by_unit_rows(problem: Problem, generator) -> Problem:
    """The same with one weak row for every column, so that whatever graph came out is determined."""
    weak = np.diag(0.1 * problem.norms + (problem.norms == 0))
    dense = np.vstack([problem.dense, weak])
    right = np.concatenate([problem.right_side, generator.standard_normal(len(weak))])
    return Problem(dense, right, problem.groups, problem.positions.copy())


@settings(max_examples=15, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_order_of_rows_columns_and_groups_changes_nothing(seed):
    problem = network(50, seed=21, common=1, long_sides=20)
    generator = np.random.default_rng(seed)
    rows, columns = generator.permutation(len(problem.dense)), generator.permutation(problem.dense.shape[1])
    names = generator.permutation(len(problem.positions))
    positions = np.empty_like(problem.positions)
    positions[names] = problem.positions
    shuffled = Problem(
        problem.dense[np.ix_(rows, columns)], problem.right_side[rows], names[problem.groups][columns], positions
    )
    expected = problem.factor().solution[columns]
    atol = ROUNDING * problem.condition * np.abs(expected).max()
    np.testing.assert_allclose(shuffled.factor().solution, expected, rtol=0, atol=atol)
    assert_agrees(shuffled, shuffled.factor())
