"""Condition number by the Lanczos iteration, forward and inverse."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
import scipy.linalg

from adjust.arrays import FloatArray

if TYPE_CHECKING:
    from adjust.solver.factor import Factor

STEPS = 60  # Lanczos steps: extreme eigenvalues of network matrices settle well before
SETTLED = 1e-6  # relative change of the Ritz value: a condition number is quoted to three digits


def condition_number(factor: Factor) -> float:
    """σ_max / σ_min of A with unit column norms: Lanczos on SAᵀAS and on its inverse.

    Golub & Van Loan 2013, *Matrix Computations*, 4th edition, section 10.1.
    """
    matrix, transposed = factor.matrix, factor.matrix.T.tocsr()
    norms = np.sqrt(np.bincount(matrix.indices, matrix.data**2, matrix.shape[1]))[:, None]

    def forward(x: FloatArray) -> FloatArray:
        return np.asarray(transposed @ (matrix @ (x / norms)) / norms)

    def inverse(x: FloatArray) -> FloatArray:
        return norms * factor.normal_solve(norms * x)

    return float(np.sqrt(largest_eigenvalue(forward, len(norms)) * largest_eigenvalue(inverse, len(norms))))


def largest_eigenvalue(apply: Callable[[FloatArray], FloatArray], count: int) -> float:
    """Largest eigenvalue of a symmetric positive operator, with full reorthogonalisation and a fixed start."""
    vector = np.random.default_rng(count).standard_normal((count, 1))
    basis = np.empty((0, count))
    diagonal: list[float] = []
    beside: list[float] = []
    best = 0.0
    for _ in range(min(STEPS, count)):
        vector /= np.linalg.norm(vector)
        basis = np.vstack([basis, vector.T])
        image = apply(vector)
        diagonal.append(float((vector.T @ image)[0, 0]))
        for _ in range(2):
            image -= basis.T @ (basis @ image)
        ritz = float(scipy.linalg.eigvalsh_tridiagonal(np.array(diagonal), np.array(beside))[-1])
        beside.append(float(np.linalg.norm(image)))
        if beside[-1] <= np.finfo(float).eps * ritz or abs(ritz - best) <= SETTLED * ritz:
            return ritz
        best, vector = ritz, image
    return best
