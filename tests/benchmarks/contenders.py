"""What is timed: this package's solver and its peers, each on the same linear problem.

Each contender is a function from a problem to the seconds of its parts. Preparing a peer's own data structures is not
timed. A peer that is not installed raises ImportError, and the table says so.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import contextmanager
from dataclasses import dataclass
from time import perf_counter

import numpy as np

from adjust.arrays import IntArray
from tests.benchmarks.grid import GridProblem

SAMPLED_MARKS = 400  # whose marginal covariances GTSAM computes one by one; the time is scaled up to all marks
LSMR_TOLERANCE = 1e-12  # of its two stopping tests: some eleven digits, as the direct methods give


@dataclass
class Stopwatch:
    """Seconds by part of the work."""

    seconds: dict[str, float]

    @contextmanager
    def time(self, part: str):
        """Add the time spent inside to a part."""
        start = perf_counter()
        yield
        self.seconds[part] = self.seconds.get(part, 0.0) + perf_counter() - start


def hubtack(problem: GridProblem) -> dict[str, float]:
    """Analysis, QR, solution, covariances of all marks and observed pairs, all redundancy numbers."""
    from adjust.solver import analyse

    first, second = asked_covariances(problem)
    watch = Stopwatch({})
    with watch.time("analysis"):
        analysis = analyse(problem.matrix, problem.groups, problem.positions)
    with watch.time("QR"):
        factor = analysis.factorise(problem.matrix, problem.right_side)
    with watch.time("solution"):
        solution = factor.solution
    with watch.time("covariance"):
        covariance = factor.selected_covariance(first, second)
        redundancy = 1.0 - covariance.row_variances
    rows, columns = problem.matrix.shape
    assert abs(redundancy.sum() - (rows - columns)) < 1e-6 * rows
    assert np.abs(problem.matrix.T @ (problem.matrix @ solution - problem.right_side)).max() < 1e-6
    return watch.seconds


def asked_covariances(problem: GridProblem) -> tuple[IntArray, IntArray]:
    """Pairs of coordinate columns: every mark with itself and with the marks it observes, coordinate by coordinate."""
    marks = len(problem.positions)
    coordinates = np.full((marks, 2), -1)
    held = np.bincount(problem.groups, minlength=marks) < 3
    coordinates[~held] = np.arange(2 * np.count_nonzero(~held)).reshape(-1, 2)
    pairs = np.concatenate([np.column_stack([np.arange(marks)] * 2), problem.sides])
    first = np.repeat(coordinates[pairs[:, 0]], 2, axis=1).ravel()
    second = np.tile(coordinates[pairs[:, 1]], (1, 2)).ravel()
    wanted = (first >= 0) & (second >= 0)
    return first[wanted], second[wanted]


def cholmod(problem: GridProblem) -> dict[str, float]:
    """CHOLMOD of cvxopt on the normal equations, which are formed beforehand."""
    import cvxopt
    import cvxopt.cholmod

    normal = (problem.matrix.T @ problem.matrix).tocoo()
    row, column = normal.coords
    sparse = cvxopt.spmatrix(normal.data, row, column, normal.shape)
    right = cvxopt.matrix(problem.matrix.T @ problem.right_side)
    watch = Stopwatch({})
    with watch.time("symbolic"):
        factor = cvxopt.cholmod.symbolic(sparse)
    with watch.time("factor"):
        cvxopt.cholmod.numeric(sparse, factor)
    with watch.time("solve"):
        cvxopt.cholmod.solve(factor, right)
    return watch.seconds


def spqr(problem: GridProblem) -> dict[str, float]:
    """SuiteSparseQR of pyspqr, its default ordering; the factor only."""
    import pyspqr

    matrix = problem.matrix.tocsc()
    matrix.indices, matrix.indptr = matrix.indices.astype(np.int32), matrix.indptr.astype(np.int32)
    watch = Stopwatch({})
    with watch.time("factor"):
        pyspqr.qr(matrix, ordering="DEFAULT")
    return watch.seconds


def gtsam(problem: GridProblem) -> dict[str, float]:
    """GTSAM: elimination and solution, and the marginal covariance of every mark, scaled up from a sample of them."""
    import gtsam as library

    graph = library.GaussianFactorGraph()
    model = library.noiseModel.Unit.Create(1)
    matrix, groups = problem.matrix, problem.groups
    columns = [np.flatnonzero(groups == mark) for mark in range(len(problem.positions))]
    local = np.empty(len(groups), dtype=np.int64)
    for own in columns:
        local[own] = np.arange(len(own))
    for start, end, value in zip(matrix.indptr[:-1], matrix.indptr[1:], problem.right_side, strict=True):
        blocks: dict[int, np.ndarray] = {}
        for column, element in zip(matrix.indices[start:end], matrix.data[start:end], strict=True):
            mark = int(groups[column])
            blocks.setdefault(mark, np.zeros((1, len(columns[mark]))))[0, local[column]] = element
        keys = [part for item in blocks.items() for part in item]
        graph.add(library.JacobianFactor(*keys, np.array([value]), model))
    watch = Stopwatch({})
    with watch.time("optimise"):
        tree = graph.eliminateMultifrontal()
        tree.optimize()
    marks = len(problem.positions)
    sample = np.unique(np.linspace(0, marks - 1, min(SAMPLED_MARKS, marks)).astype(int))
    with watch.time("marginals"):
        for mark in sample.tolist():
            tree.marginalCovariance(mark)
    watch.seconds["marginals"] *= marks / len(sample)
    return watch.seconds


def lsmr(problem: GridProblem) -> dict[str, float]:
    """LSMR of SciPy: the solution alone, columns scaled to unit norm."""
    from scipy.sparse import diags_array
    from scipy.sparse.linalg import lsmr as solve

    norms = np.sqrt(np.bincount(problem.matrix.indices, problem.matrix.data**2, problem.matrix.shape[1]))
    scaled = (problem.matrix @ diags_array(1.0 / norms)).tocsr()
    watch = Stopwatch({})
    with watch.time("solution"):
        solve(scaled, problem.right_side, atol=LSMR_TOLERANCE, btol=LSMR_TOLERANCE, maxiter=100_000)
    return watch.seconds


CONTENDERS: dict[str, Callable[[GridProblem], dict[str, float]]] = {
    "Hubtack": hubtack,
    "CHOLMOD": cholmod,
    "SuiteSparseQR": spqr,
    "GTSAM": gtsam,
    "LSMR": lsmr,
}
LARGEST = {"Hubtack": 10**9, "CHOLMOD": 10**9, "SuiteSparseQR": 10**9, "GTSAM": 40_000, "LSMR": 10_000}
"""Marks beyond which a contender is left out of the table, for it would take many minutes."""
