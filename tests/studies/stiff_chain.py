"""A stiff network: how many digits are left where weights are 10⁶ apart along a thin chain held at one end?

    python -m tests.studies.stiff_chain    # rewrites the table of docs/validation-linear.md

Invented: a ladder of trilaterated quadrilaterals, its two first marks held. Every other quadrilateral is measured with
10⁶ times the weight of those that join them. The reference is the solution of the same rows in 60-digit arithmetic.
"""

from __future__ import annotations

from dataclasses import dataclass

import mpmath
import numpy as np
import scipy.linalg
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver import analyse
from tests.studies.pages import rewrite

STIFFNESS = 1e6
"""Weight of a side of the stiff quadrilaterals over that of the sides that join them."""
RAIL, RUNG = 100.0, 10.0
"""Metres: a chain ten times thinner than the step from one rung to the next."""
DIGITS = 60
"""Of the reference: twice as many as the worst condition number of the table, squared, could eat."""
LENGTHS = (8, 16, 32, 64, 128)
"""Rungs beyond the one that is held."""
FAR = 4
"""Coordinates of the far rung."""
BAND = 7
"""Columns on either side that a column of AᵀA meets: two rungs of two marks of two coordinates, less itself."""


@dataclass(frozen=True)
class Chain:
    """The rows of a ladder (rows, columns), its observations, and the mark of each column and its place."""

    matrix: FloatArray
    observed: FloatArray
    groups: IntArray
    positions: FloatArray


def chain(rungs: int, seed: int = 7) -> Chain:
    """A ladder with so many rungs beyond the one that is held; marks 2 k and 2 k + 1 are the ends of rung k."""
    generator = np.random.default_rng(seed)
    along, across = np.divmod(np.arange(2 * rungs + 2), 2)
    positions = np.column_stack([RAIL * along, RUNG * across]) + generator.uniform(-1.0, 1.0, (2 * rungs + 2, 2))
    first = np.arange(rungs)[:, None] * 2
    sides = (first[:, :, None] + np.array([[0, 2], [1, 3], [2, 3], [0, 3], [1, 2]])).reshape(-1, 2)
    step = positions[sides[:, 1]] - positions[sides[:, 0]]
    weight = np.where(sides.min(axis=1) // 2 % 2 == 1, STIFFNESS, 1.0)
    cosines = step / np.linalg.norm(step, axis=1, keepdims=True) * np.sqrt(weight)[:, None]
    matrix = np.zeros((len(sides), len(positions), 2))
    rows = np.arange(len(sides))
    matrix[rows, sides[:, 0]], matrix[rows, sides[:, 1]] = -cosines, cosines
    observed = generator.standard_normal(len(sides))
    return Chain(matrix[:, 2:].reshape(len(sides), -1), observed, np.repeat(np.arange(2 * rungs), 2), positions[2:])


def reference(problem: Chain) -> tuple[list[mpmath.mpf], list[mpmath.mpf]]:
    """Solution, and the variances of the far rung's coordinates, in 60-digit arithmetic."""
    with mpmath.workdps(DIGITS):
        rows = [{int(k): mpmath.mpf(row[k]) for k in np.flatnonzero(row)} for row in problem.matrix]
        count = problem.matrix.shape[1]
        normal = [[mpmath.mpf(0)] * count for _ in range(count)]
        right = [mpmath.mpf(0)] * count
        for row, value in zip(rows, problem.observed.tolist(), strict=True):
            for i, a in row.items():
                right[i] += a * mpmath.mpf(value)
                for k, b in row.items():
                    normal[i][k] += a * b
        lower = banded_cholesky(normal)
        units = {k: [mpmath.mpf(i == k) for i in range(count)] for k in range(count - FAR, count)}
        return banded_solve(lower, right), [banded_solve(lower, unit)[k] for k, unit in units.items()]


def banded_cholesky(normal: list[list[mpmath.mpf]]) -> list[list[mpmath.mpf]]:
    """L of AᵀA = L Lᵀ, with no element more than BAND columns from the diagonal."""
    count = len(normal)
    lower = [[mpmath.mpf(0)] * count for _ in range(count)]
    for i in range(count):
        for k in range(max(0, i - BAND), i + 1):
            rest = normal[i][k] - sum(lower[i][j] * lower[k][j] for j in range(max(0, i - BAND), k))
            lower[i][k] = mpmath.sqrt(rest) if i == k else rest / lower[k][k]
    return lower


def banded_solve(lower: list[list[mpmath.mpf]], right: list[mpmath.mpf]) -> list[mpmath.mpf]:
    """x of L Lᵀ x = right."""
    x, count = list(right), len(right)
    for i in range(count):
        x[i] = (x[i] - sum(lower[i][k] * x[k] for k in range(max(0, i - BAND), i))) / lower[i][i]
    for i in reversed(range(count)):
        x[i] = (x[i] - sum(lower[k][i] * x[k] for k in range(i + 1, min(count, i + BAND + 1)))) / lower[i][i]
    return x


def by_block_qr(problem: Chain) -> tuple[FloatArray, FloatArray]:
    """Solution and variances of the far rung by this package's solver."""
    matrix = scipy.sparse.csr_array(problem.matrix)
    factor = analyse(matrix, problem.groups, problem.positions).factorise(matrix, problem.observed)
    columns = np.arange(matrix.shape[1])[-FAR:]
    return factor.solution, factor.selected_covariance(columns, columns).entries


def by_normal_equations(problem: Chain) -> tuple[FloatArray, FloatArray]:
    """The same from AᵀA x = Aᵀb by Cholesky with columns scaled to unit norm; NaN where AᵀA is no longer positive."""
    norms = np.linalg.norm(problem.matrix, axis=0)
    scaled = problem.matrix / norms
    try:
        inverse = scipy.linalg.cho_solve(scipy.linalg.cho_factor(scaled.T @ scaled), np.eye(len(norms)))
    except np.linalg.LinAlgError:
        return np.full(len(norms), np.nan), np.full(FAR, np.nan)
    return inverse @ (scaled.T @ problem.observed) / norms, (np.diag(inverse) / norms**2)[-FAR:]


def digits(found: FloatArray, true: list[mpmath.mpf]) -> float:
    """Matching digits of a vector: −log₁₀ of its largest error over its largest element; 0 for NaN."""
    if np.isnan(found).any():
        return 0.0
    with mpmath.workdps(DIGITS):
        error = max(abs(mpmath.mpf(value) - exact) for value, exact in zip(found.tolist(), true, strict=True))
        return float(max(mpmath.mpf(0), -mpmath.log10(error / max(abs(exact) for exact in true))))


def table() -> str:
    """Digits by the length of the chain."""
    lines = [
        "| rungs | κ | solution: QR | solution: normal | variances: QR | variances: normal |",
        "| ---: | ---: | ---: | ---: | ---: | ---: |",
    ]
    for rungs in LENGTHS:
        problem = chain(rungs)
        true = reference(problem)
        condition = np.linalg.cond(problem.matrix / np.linalg.norm(problem.matrix, axis=0))
        found = [by_block_qr(problem), by_normal_equations(problem)]
        cells = [f"{digits(method[quantity], true[quantity]):.1f}" for quantity in range(2) for method in found]
        lines.append(f"| {rungs} | {condition:.0e} | " + " | ".join(cells) + " |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    rewrite("validation-linear.md", "stiff chain", table())
    print(table())
