"""What the linear solver cannot go below: its floating-point operations, and how fast this processor does them.

    python -m tests.benchmarks.floor              # 10,000 marks
    python -m tests.benchmarks.floor 100000

Operations are counted front by front: those of Cholesky's method in the same order of elimination (Golub & Van Loan
2013, *Matrix Computations*, section 4.2), those of the Householder reflections over the rows that they reach (section
5.2), those of the covariances. Rates are of one processor core.
"""

from __future__ import annotations

import sys
from time import perf_counter

import numpy as np

from adjust.solver import analyse, factor, workers
from adjust.solver.layout import Batch
from tests.benchmarks.grid import grid_problem

PRODUCT = 512  # rows and columns of the product that shows what the processor can do
REPETITIONS = 5  # the quickest counts


def operations(batch: Batch) -> np.ndarray:
    """Operations of Cholesky's method, of the reflections and of the covariances of all fronts of a batch."""
    count, own, border = batch.shape
    beside = own + border + 0.5 - np.arange(own + border + 1)
    cholesky = count * np.sum(beside[:own] ** 2)
    reach = (batch.piles - batch.wedges)[:, None] + np.arange(1, own + border + 2)
    reflections = np.sum(4.0 * np.minimum(reach, batch.piles[:, None]) * beside)
    covariances = count * own * (own**2 + 2.0 * own * border + 2.0 * border**2 + 2.0 * own * border)
    return np.array([cholesky, reflections, covariances])


def quickest(work) -> float:
    """Seconds of the quickest repetition."""
    seconds = []
    for _ in range(REPETITIONS):
        start = perf_counter()
        work()
        seconds.append(perf_counter() - start)
    return min(seconds)


def main() -> None:
    """Print the operations, the rates, and the seconds that follow from them."""
    problem = grid_problem(int(sys.argv[1]) if len(sys.argv) > 1 else 10_000)
    analysis = analyse(problem.matrix, problem.groups, problem.positions)
    cholesky, reflections, covariances = sum(map(operations, analysis.layout.batches)) / 1e9
    absorbed, inside = factor.absorb, []

    def absorb(*arguments) -> None:
        start = perf_counter()
        absorbed(*arguments)
        inside[-1] += perf_counter() - start

    def factorise() -> None:
        inside.append(0.0)
        analysis.factorise(problem.matrix, problem.right_side)

    factor.absorb, workers.MOST_WORKERS = absorb, 1
    whole = quickest(factorise)
    square = np.ones((PRODUCT, PRODUCT))
    with workers.one_blas_thread():
        product = 2e-9 * PRODUCT**3 / quickest(lambda: square @ square)
    print(f"Cholesky {cholesky:.2f}, reflections {reflections:.2f}, covariances {covariances:.2f} Gflop")
    print(f"matrix product {product:.0f} Gflop/s: reflections {reflections / product:.3f} s at that rate")
    print(f"reflections {min(inside):.3f} s, {reflections / min(inside):.1f} Gflop/s; the whole QR {whole:.3f} s")


if __name__ == "__main__":
    main()
