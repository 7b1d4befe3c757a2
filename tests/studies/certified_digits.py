"""How many certified digits does the solver give, and how many do normal equations?

    python -m tests.studies.certified_digits    # rewrites the tables of docs/validation-linear.md

The data are NIST's Statistical Reference Datasets for linear regression (`tests/data/linear_certified.json` names
the source of each). Digits are counted as NIST does: the log relative error −log₁₀(|found − certified| / |certified|),
or −log₁₀ |found| where the certified value is zero, at most the 15 digits that are certified.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np
import scipy.linalg
import scipy.sparse

from adjust.arrays import FloatArray
from adjust.solver import analyse
from tests.published import published
from tests.studies.pages import rewrite

CERTIFIED_DIGITS = 15.0
DEGREE = {"Wampler": 5, "Filip": 10}
"""Of the polynomials; the other models are linear in the columns of their tables."""


@dataclass(frozen=True)
class Regression:
    """One dataset: design matrix, observations and the certified results."""

    name: str
    matrix: FloatArray
    observed: FloatArray
    certified: dict[str, FloatArray]


@dataclass(frozen=True)
class Fit:
    """Coefficients and their sds, residual sd, R² and residual sum of squares, by one method."""

    values: dict[str, FloatArray]


Solver = Callable[[FloatArray, FloatArray], tuple[FloatArray, FloatArray]]
"""Coefficients and cofactors (their covariance for σ = 1 on the diagonal) from a design matrix and observations."""


def regressions() -> list[Regression]:
    """All datasets, in the order of the file."""
    return [read(entry) for entry in published("linear_certified.json").values()]


def read(entry: dict[str, Any]) -> Regression:
    """A dataset as the file holds it: the first column is observed, the others the model's."""
    name = entry["title"].rsplit(": ", 1)[1]
    rows = np.array([[float(word) for word in row] for row in entry["inputs"]["rows"]])
    degree = next((degree for stem, degree in DEGREE.items() if name.startswith(stem)), None)
    if degree is not None:
        matrix = rows[:, 1:2] ** np.arange(degree + 1)
    elif "no intercept" in entry["inputs"]["model"]:
        matrix = rows[:, 1:]
    else:
        matrix = np.column_stack([np.ones(len(rows)), rows[:, 1:]])
    certified = {
        name: np.atleast_1d(np.array(value, dtype=float))
        for name, value in entry["published_outputs"].items()
        if name != "dof" and value is not None
    }
    return Regression(name, matrix, rows[:, 0], certified)


def by_block_qr(matrix: FloatArray, observed: FloatArray) -> tuple[FloatArray, FloatArray]:
    """The solver of this package."""
    sparse = scipy.sparse.csr_array(matrix)
    columns = np.arange(matrix.shape[1])
    factor = analyse(sparse, columns).factorise(sparse, observed)
    return factor.solution, factor.selected_covariance(columns, columns).entries


def by_normal_equations(matrix: FloatArray, observed: FloatArray) -> tuple[FloatArray, FloatArray]:
    """AᵀA x = Aᵀb by Cholesky, columns scaled to unit norm first, which is the best that can be done for it."""
    norms = np.linalg.norm(matrix, axis=0)
    scaled = matrix / norms
    factor = scipy.linalg.cho_factor(scaled.T @ scaled)
    cofactors = scipy.linalg.cho_solve(factor, np.eye(len(norms)))
    return scipy.linalg.cho_solve(factor, scaled.T @ observed) / norms, np.diag(cofactors) / norms**2


def fit(regression: Regression, solver: Solver) -> Fit:
    """All certified quantities by one method."""
    coefficients, cofactors = solver(regression.matrix, regression.observed)
    residuals = exact_residuals(regression, coefficients)
    squares = residuals @ residuals
    variance = squares / (len(residuals) - len(coefficients))
    about = regression.observed - (regression.observed.mean() if has_constant(regression.matrix) else 0.0)
    found = {
        "B": coefficients,
        "sd_B": np.sqrt(variance * cofactors),
        "residual_sd": np.sqrt(variance),
        "R2": 1.0 - squares / (about @ about),
        "residual_sum_of_squares": squares,
    }
    return Fit({name: np.atleast_1d(value) for name, value in found.items()})


def exact_residuals(regression: Regression, coefficients: FloatArray) -> FloatArray:
    """Observed minus fitted, rounded once: the terms of Filip's polynomial are ten orders larger than its residuals."""
    known = [Fraction(value) for value in coefficients.tolist()]
    fitted = [sum(Fraction(a) * x for a, x in zip(row, known, strict=True)) for row in regression.matrix.tolist()]
    return np.array([float(Fraction(y) - f) for y, f in zip(regression.observed.tolist(), fitted, strict=True)])


def has_constant(matrix: FloatArray) -> bool:
    """Whether the model has an intercept; R² is then about the mean, else about zero, as NIST certifies it."""
    return bool(np.all(matrix[:, 0] == 1.0))


def digits(found: FloatArray, certified: FloatArray) -> float:
    """Matching digits of the worst of some values."""
    scale = np.where(certified == 0, 1.0, np.abs(certified))
    error = np.max(np.abs(found - certified) / scale)
    return float(np.clip(-np.log10(max(error, 10.0**-CERTIFIED_DIGITS)), 0.0, CERTIFIED_DIGITS))


def score(regression: Regression, solver: Solver) -> dict[str, float]:
    """Matching digits of each certified quantity; none at all where the method breaks down."""
    try:
        found = fit(regression, solver).values
    except np.linalg.LinAlgError:
        return dict.fromkeys(regression.certified, 0.0)
    return {name: digits(found[name], value) for name, value in regression.certified.items()}


QUANTITIES = {"B": "coefficients", "sd_B": "their sds", "residual_sd": "residual sd", "R2": "R²"}


def table() -> str:
    """Digits of both methods side by side."""
    heads = [f"{name}: {method}" for name in QUANTITIES.values() for method in ("QR", "normal")]
    lines = ["| dataset | κ | " + " | ".join(heads) + " |", "| --- | ---: |" + " ---: |" * len(heads)]
    for regression in regressions():
        orthogonal, normal = score(regression, by_block_qr), score(regression, by_normal_equations)
        cells = [f"{score[name]:.1f}" for name in QUANTITIES for score in (orthogonal, normal)]
        condition = np.linalg.cond(regression.matrix / np.linalg.norm(regression.matrix, axis=0))
        lines.append(f"| {regression.name} | {condition:.0e} | " + " | ".join(cells) + " |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    rewrite("validation-linear.md", "certified digits", table())
    print(table())
