"""The solver against weighted least squares of statsmodels: coefficients, covariance, leverage."""

import numpy as np
import pytest
import scipy.sparse
import statsmodels.api as sm

from adjust.solver import analyse
from tests.benchmarks.grid import grid_problem
from tests.sparse_problems import network


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_weighted_regression(seed):
    problem = network(30, seed=seed, long_sides=15, common=1)
    generator = np.random.default_rng(seed)
    weight = 10.0 ** generator.uniform(-3, 3, len(problem.dense))
    compare(problem.dense, problem.right_side, weight, problem.groups, problem.positions)


def test_a_grid_of_directions_and_distances():
    problem = grid_problem(49)
    compare(
        problem.matrix.toarray(),
        problem.right_side,
        np.ones(len(problem.right_side)),
        problem.groups,
        problem.positions,
    )


def compare(dense, observed, weight, groups, positions):
    fitted = sm.WLS(observed, dense, weights=weight).fit(method="qr")
    root = np.sqrt(weight)
    matrix = scipy.sparse.csr_array(dense * root[:, None])
    factor = analyse(matrix, groups, positions).factorise(matrix, observed * root)
    columns = np.arange(dense.shape[1])
    selected = factor.selected_covariance(columns, columns)
    sds = np.sqrt(np.diag(fitted.normalized_cov_params))
    np.testing.assert_allclose(factor.solution / sds, fitted.params / sds, rtol=0, atol=1e-9)  # of a standard deviation
    np.testing.assert_allclose(np.sqrt(selected.entries) / sds, 1.0, rtol=0, atol=1e-9)
    leverage = sm.OLS(fitted.model.wendog, fitted.model.wexog).fit(method="qr").get_influence().hat_matrix_diag
    np.testing.assert_allclose(selected.row_variances, leverage, rtol=0, atol=1e-9)  # of 1
