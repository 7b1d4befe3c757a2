"""The benchmark network: directions and distances along the sides of a jittered, triangulated grid of marks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray

SPACING = 200.0  # m: a usual side of a traverse in built-up ground
JITTER = 0.3  # of the spacing, so that no two sides are alike
DIRECTION_SD = np.deg2rad(1.5 / 3600)  # rad: one direction of a round, a one-second total station
DISTANCE_SD = 0.0015  # m: the same instrument's distance, centring included


@dataclass(frozen=True)
class GridProblem:
    """A linear least-squares problem min |A x − b| whose rows all have sd 1, and where its marks lie.

    Each mark has columns easting, northing and the orientation of its one round of directions; the four corner marks
    are held, so only their orientations are columns. `groups` (columns,) is each column's mark.
    """

    matrix: scipy.sparse.csr_array
    right_side: FloatArray
    groups: IntArray
    positions: FloatArray
    sides: IntArray


def grid_sides(width: int, height: int) -> IntArray:
    """Pairs of marks (sides, 2) along the rows, the columns and one diagonal of the grid."""
    number = np.arange(width * height).reshape(height, width)
    along = [(number[:, :-1], number[:, 1:]), (number[:-1], number[1:]), (number[:-1, :-1], number[1:, 1:])]
    return np.concatenate([np.column_stack([first.ravel(), last.ravel()]) for first, last in along])


def grid_problem(marks: int, seed: int = 1) -> GridProblem:
    """A square grid of about `marks` marks: a direction from either end of each side, and one distance."""
    width = round(np.sqrt(marks))
    generator = np.random.default_rng(seed)
    lattice = np.stack(np.meshgrid(np.arange(width), np.arange(width)), axis=-1).reshape(-1, 2)
    positions = SPACING * (lattice + generator.uniform(-JITTER, JITTER, lattice.shape))
    sides = grid_sides(width, width)
    corners = np.array([0, width - 1, width * (width - 1), width * width - 1])
    columns, groups = number_columns(width * width, corners)
    matrix = assemble(positions, sides, columns)
    return GridProblem(matrix, generator.standard_normal(matrix.shape[0]), groups, positions, sides)


def number_columns(marks: int, held: IntArray) -> tuple[IntArray, IntArray]:
    """Columns (marks, 3) of easting, northing and orientation, −1 where held, and the mark of each column."""
    free = np.ones((marks, 2), dtype=bool)
    free[held] = False
    coordinates = np.where(free, (np.cumsum(free) - 1).reshape(free.shape), -1)
    count = int(free.sum())
    columns = np.column_stack([coordinates, count + np.arange(marks)])
    return columns, np.concatenate([np.nonzero(free)[0], np.arange(marks)])


def assemble(positions: FloatArray, sides: IntArray, columns: IntArray) -> scipy.sparse.csr_array:
    """Rows of A: directions from the first end, directions from the last end, distances; each divided by its sd."""
    at, to = np.concatenate([sides, sides[:, ::-1]]).T
    step = positions[to] - positions[at]
    length = np.linalg.norm(step, axis=1, keepdims=True)
    turn = np.column_stack([step[:, 1], -step[:, 0]]) / length**2
    orientation = np.full((len(at), 1), -1.0)
    directions = np.hstack([-turn, turn, orientation]) / DIRECTION_SD
    directed = np.hstack([columns[at, :2], columns[to, :2], columns[at, 2:]])
    stretch = (step / length)[: len(sides)] / DISTANCE_SD
    distances = np.hstack([-stretch, stretch])
    measured = np.hstack([columns[sides[:, 0], :2], columns[sides[:, 1], :2]])
    return join_rows([(directions, directed), (distances, measured)], int(columns.max()) + 1)


def join_rows(blocks: list[tuple[FloatArray, IntArray]], columns: int) -> scipy.sparse.csr_array:
    """One sparse matrix from blocks of coefficients and their columns (rows, entries), column −1 left out."""
    offsets = np.cumsum([0] + [len(values) for values, _ in blocks])
    numbers = [
        np.broadcast_to(np.arange(start, start + len(at))[:, None], at.shape)
        for start, (_, at) in zip(offsets, blocks, strict=False)
    ]
    rows, where, values = (
        np.concatenate([part.ravel() for part in parts])
        for parts in (numbers, [at for _, at in blocks], [values for values, _ in blocks])
    )
    kept = where >= 0
    return scipy.sparse.csr_array((values[kept], (rows[kept], where[kept])), shape=(offsets[-1], columns))
