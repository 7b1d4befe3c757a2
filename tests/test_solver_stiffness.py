"""A stiff chain: digits against 60-digit arithmetic, the solver's and those of normal equations."""

import numpy as np
import pytest
import scipy.sparse

from adjust.solver import analyse
from tests.studies.stiff_chain import DIGITS, by_block_qr, by_normal_equations, chain, digits, reference

LONGEST = 128


@pytest.fixture(scope="module", name="scores")
def _scores():
    problem = chain(LONGEST)
    true = reference(problem)
    methods = {"QR": by_block_qr(problem), "normal": by_normal_equations(problem)}
    return {
        (name, what): digits(found[k], true[k])
        for name, found in methods.items()
        for k, what in enumerate(("solution", "variances"))
    }


@pytest.mark.parametrize("what", ["solution", "variances"])
def test_normal_equations_lose_six_digits_more(scores, what):
    assert scores["QR", what] >= 7.5  # 16 − log₁₀ κ = 8.1 for κ = 8 × 10⁷
    assert scores["QR", what] - scores["normal", what] >= 6.0


def test_the_reference_has_digits_to_spare():
    problem = chain(8)
    solution, _ = reference(problem)
    dense = np.linalg.lstsq(problem.matrix, problem.observed, rcond=None)[0]
    assert DIGITS > 2 * 16
    assert digits(dense, solution) > 9.0  # κ = 4 × 10⁵ leaves some ten digits of sixteen


@pytest.mark.parametrize("rungs", [8, 64])
def test_redundancy_numbers_keep_their_digits(rungs):
    problem = chain(rungs)
    matrix = scipy.sparse.csr_array(problem.matrix)
    factor = analyse(matrix, problem.groups, problem.positions).factorise(matrix, problem.observed)
    nothing = np.empty(0, dtype=np.int64)
    variances = factor.selected_covariance(nothing, nothing).row_variances
    leverage = np.sum(np.linalg.qr(problem.matrix / np.linalg.norm(problem.matrix, axis=0))[0] ** 2, axis=1)
    np.testing.assert_allclose(variances, leverage, rtol=0, atol=1e-8)  # of 1
    assert variances.max() < 1.0  # a C aᵀ from C alone would pass 1 by a thousandth here
