"""Which observation to measure again where the data leave more than one explanation."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import BoolArray, FloatArray
from adjust.blunders.evidence import Allowed
from adjust.blunders.system import System

APART = 4.13
"""Sds by which two predictions of a repeated observation must differ to be told apart: 3.29 + 0.84, the w-test at
0.001 with a power of 0.80 (Baarda 1968)."""


def separations(system: System, columns: csr_array, lasting: BoolArray, named: Allowed, other: Allowed) -> FloatArray:
    """By how many of its sds a repetition (rows,) of each system row would differ under two explanations.

    x_S − x_S' = C Ãᵀ(H' ∇' − H ∇). An error of held coordinates, `lasting` (columns,), is in the repetition as it was
    in the observation: H_c ∇_c − H'_c ∇'_c comes on top. A repetition has the variance 1 of the row and that of the
    prediction, here the one with no errors allowed for, diag(Ã C Ãᵀ).
    """
    away = columns[:, other.columns] @ other.errors - columns[:, named.columns] @ named.errors
    held = columns[:, other.columns] @ (other.errors * lasting[other.columns])
    held = held - columns[:, named.columns] @ (named.errors * lasting[named.columns])
    moved = system.factor.normal_solve((system.matrix.T @ away)[:, None])[:, 0]
    leverage = np.concatenate([np.einsum("rii->ri", block).ravel() for block in system.leverage])
    return np.asarray(np.abs(system.matrix @ moved - held) / np.sqrt(1.0 + leverage), dtype=np.float64)


def deciding_row(
    system: System, columns: csr_array, lasting: BoolArray, named: Allowed, others: Sequence[Allowed]
) -> tuple[int, float] | None:
    """The system row whose repetition separates `named` from the nearest of `others` best, and by how many sds.

    None where there is nothing to separate, or no single repetition does.
    """
    if not others:
        return None
    least = np.min([separations(system, columns, lasting, named, other) for other in others], axis=0)
    row = int(np.argmax(least))
    return (row, float(least[row])) if least[row] > APART else None
