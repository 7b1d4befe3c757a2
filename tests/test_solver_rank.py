"""Dependent columns: that they are found, which motion explains them, and which columns it moves."""

import numpy as np
import pytest
import scipy.sparse

from adjust.errors import HubtackError
from adjust.solver import RankDefect, analyse
from tests.benchmarks.grid import grid_problem, grid_sides


def defect(dense, groups=None, positions=None, scale=None) -> RankDefect:
    """The defect that the solver reports."""
    dense = np.asarray(dense, dtype=float) * (1.0 if scale is None else scale)
    matrix = scipy.sparse.csr_array(dense)
    groups = np.arange(dense.shape[1]) if groups is None else groups
    with pytest.raises(RankDefect) as raised:
        analyse(matrix, groups, positions).factorise(matrix, np.ones(len(dense)))
    found = raised.value
    effect, parts = np.linalg.norm(dense @ found.motion), np.linalg.norm(np.abs(dense) @ np.abs(found.motion))
    assert effect <= 1e-10 * parts  # no row resists the motion: its parts cancel
    assert np.abs(found.motion).max() == 1.0
    return found


def levels(lines, marks):
    """Rows of levelled lines (from, to)."""
    rows = np.zeros((len(lines), marks))
    for row, (start, end) in enumerate(lines):
        rows[row, start], rows[row, end] = -1.0, 1.0
    return rows


def distances(positions, sides):
    """Rows of distances, two columns a mark."""
    step = positions[sides[:, 1]] - positions[sides[:, 0]]
    rows = np.zeros((len(sides), len(positions), 2))
    cosines = step / np.linalg.norm(step, axis=1, keepdims=True)
    rows[np.arange(len(sides)), sides[:, 0]], rows[np.arange(len(sides)), sides[:, 1]] = -cosines, cosines
    return rows.reshape(len(sides), -1)


def jittered(width, seed=3):
    """Marks of a grid, and the sides between them."""
    lattice = np.stack(np.meshgrid(np.arange(width), np.arange(width)), axis=-1).reshape(-1, 2) * 100.0
    return lattice + np.random.default_rng(seed).uniform(-20, 20, lattice.shape), grid_sides(width, width)


def test_it_is_one_of_the_errors_of_the_package():
    assert issubclass(RankDefect, HubtackError)
    assert "3 of the 3 columns" in str(defect(levels([(0, 1), (1, 2), (2, 0)], 3)))


@pytest.mark.parametrize("marks", [3, 40, 400])
def test_a_free_levelling_net_rises_as_a_whole(marks):
    lines = [(k, (k + step) % marks) for k in range(marks) for step in (1, 7)]
    found = defect(levels(lines, marks))
    np.testing.assert_allclose(found.motion, 1.0, rtol=0, atol=1e-10)  # of one metre
    np.testing.assert_array_equal(found.columns, np.arange(marks))


def test_columns_of_any_scale_hide_nothing():
    marks = 60
    scale = 10.0 ** np.random.default_rng(1).uniform(-8, 8, marks)
    lines = [(k, (k + step) % marks) for k in range(marks) for step in (1, 5)]
    found = defect(levels(lines, marks), scale=scale)
    np.testing.assert_allclose(found.motion * scale / (found.motion * scale)[0], 1.0, rtol=0, atol=1e-10)
    np.testing.assert_array_equal(found.columns, np.arange(marks))


@pytest.mark.parametrize("width", [3, 16])
def test_a_free_trilateration_moves_as_a_rigid_body(width):
    positions, sides = jittered(width)
    found = defect(distances(positions, sides), np.repeat(np.arange(width**2), 2), positions)
    east, north = np.tile([1.0, 0.0], width**2), np.tile([0.0, 1.0], width**2)
    turn = np.column_stack([positions[:, 1], -positions[:, 0]]).ravel()
    rigid = np.linalg.qr(np.column_stack([east, north, turn]))[0]
    strain = found.motion - rigid @ (rigid.T @ found.motion)
    np.testing.assert_allclose(strain, 0.0, rtol=0, atol=1e-9)  # of the largest movement


def test_only_the_part_without_a_datum_is_named():
    held = np.vstack([levels([(0, 1), (1, 2), (2, 0)], 3), [[1.0, 0.0, 0.0]]])
    free = levels([(0, 1), (1, 2), (2, 3), (3, 0)], 4)
    dense = np.block([[held, np.zeros((4, 4))], [np.zeros((4, 3)), free]])
    found = defect(dense)
    np.testing.assert_array_equal(found.columns, [3, 4, 5, 6])
    np.testing.assert_allclose(found.motion, [0, 0, 0, 1, 1, 1, 1], rtol=0, atol=1e-12)


def test_a_mark_on_one_distance_swings_alone():
    positions, sides = jittered(12)
    pinned = np.zeros((3, 288))
    pinned[[0, 1, 2], [0, 1, 2]] = 1.0
    dense = np.vstack([distances(positions, sides), pinned])
    lonely = np.zeros((len(dense) + 1, 290))
    lonely[:-1, :288] = dense
    lonely[-1, [0, 1, 288, 289]] = [-0.6, -0.8, 0.6, 0.8]
    groups = np.repeat(np.arange(145), 2)
    found = defect(lonely, groups, np.vstack([positions, [[-60.0, -80.0]]]))
    np.testing.assert_array_equal(found.columns, [288, 289])
    across = found.motion[288:] / np.linalg.norm(found.motion[288:])
    np.testing.assert_allclose(np.abs(across), [0.8, 0.6], rtol=0, atol=1e-12)


def test_a_column_no_row_touches_is_named():
    dense = np.vstack([np.eye(5)] * 2)
    dense[:, 3] = 0.0
    found = defect(dense)
    np.testing.assert_array_equal(found.columns, [3])
    np.testing.assert_array_equal(found.motion, [0, 0, 0, 1, 0])


def test_fewer_rows_than_columns():
    dense = np.random.default_rng(5).standard_normal((4, 6))
    defect(dense)


def test_a_benchmark_grid_without_its_distances_has_no_datum_but_its_corners():
    problem = grid_problem(49)
    directions = problem.matrix[: 2 * len(problem.sides)].toarray()
    kept = np.flatnonzero(np.isin(problem.groups, [0, 6, 42, 48], invert=True) | (np.arange(len(problem.groups)) >= 90))
    matrix = scipy.sparse.csr_array(directions[:, kept])
    factor = analyse(matrix, problem.groups[kept], problem.positions).factorise(
        matrix, problem.right_side[: len(directions)]
    )
    assert np.isfinite(factor.solution).all()  # four held corners are a datum for directions too


def test_a_weak_but_determined_column_is_no_defect():
    dense = np.vstack([levels([(0, 1), (1, 2), (2, 0)], 3), [[1e-6, 0.0, 0.0]]])
    matrix = scipy.sparse.csr_array(dense)
    solution = analyse(matrix, np.arange(3)).factorise(matrix, np.array([1.0, 1.0, -2.0, 0.0])).solution
    np.testing.assert_allclose(solution, [0.0, 1.0, 2.0], rtol=0, atol=1e-9)  # m: κ = 10⁶
