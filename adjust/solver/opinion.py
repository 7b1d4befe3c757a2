"""A second opinion: the same least-squares problem by another algorithm."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from adjust.arrays import FloatArray

if TYPE_CHECKING:
    from adjust.solver.factor import Factor

TOLERANCE = 1e-14  # of LSQR's residual and normal-equation tests: just above the rounding of one product
MOST_ITERATIONS = 50  # with R as preconditioner LSQR needs two or three


@dataclass(frozen=True)
class SecondOpinion:
    """LSQR's `solution` (columns,), its `largest_gap` to the factor's, and the `iterations` it took."""

    solution: FloatArray
    largest_gap: float
    iterations: int


def second_opinion(factor: Factor) -> SecondOpinion:
    """LSQR (Paige & Saunders 1982, *ACM TOMS* 8, 43–71) on A R⁻¹, started from zero."""
    from scipy.sparse.linalg import LinearOperator, lsqr

    matrix, transposed = factor.matrix, factor.matrix.T.tocsr()
    operator = LinearOperator(
        matrix.shape,
        matvec=lambda y: matrix @ factor.apply_inverse(y.reshape(-1, 1))[:, 0],
        rmatvec=lambda v: factor.apply_inverse_transposed((transposed @ v).reshape(-1, 1))[:, 0],
    )
    found = lsqr(operator, factor.right_side, atol=TOLERANCE, btol=TOLERANCE, iter_lim=MOST_ITERATIONS)
    solution = factor.apply_inverse(found[0][:, None])[:, 0]
    gap = float(np.max(np.abs(solution - factor.solution), initial=0.0))
    return SecondOpinion(solution, gap, int(found[2]))
