"""Where else to begin the search: what a robust estimate sets aside, thinned out to what the tests confirm.

Huber's M-estimate is the least of ½(e − γ)ᵀM(e − γ) + k Σ|γᵢ| over errors γ in units of their rows' sds: a row has an
error when its residual passes k, and the rest is soft-thresholded (She & Owen 2011, *J. American Statistical
Association* 106, 626–639, proposition 1.1). k = 1.345: 95 % efficiency on normal data (Huber 1981, *Robust Statistics*;
from memory). The minimum is found by accelerated gradient steps (Beck & Teboulle 2009, *SIAM J. Imaging Sciences* 2,
183–202).
"""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.criterion import Criterion
from adjust.blunders.evidence import Allowed, Evidence
from adjust.blunders.information import DenseInformation
from adjust.blunders.search import sound

HUBER = 1.345
"""Residual, in sds, from which on an observation is trusted less."""

STEPS = 100
"""Gradient steps: errors are needed to tell large from small, not to many digits."""


def robust_errors(evidence: Evidence, rows: int, known: Allowed) -> FloatArray:
    """Huber's γ (rows,) for the columns of the `rows` single components, in units of their sds; needs all of G.

    The steps begin with the errors that are `known`: to gross ones they would not come in time.
    """
    assert isinstance(evidence.information, DenseInformation)
    unit = 1.0 / np.sqrt(evidence.weight[:rows])
    matrix = evidence.information.matrix[:rows, :rows] * np.outer(unit, unit)
    score = evidence.score[:rows] * unit
    # M is a projector and correlated rows come by threes, so that no eigenvalue passes 3.
    step = 1.0 / max(3 * (3 in evidence.members), 1)
    errors = np.zeros(rows)
    single = known.columns < rows
    errors[known.columns[single]] = known.errors[single] / unit[known.columns[single]]
    momentum = errors
    weight = 1.0
    for _ in range(STEPS):
        moved = momentum + step * (score - matrix @ momentum)
        reached = np.sign(moved) * np.maximum(np.abs(moved) - HUBER * step, 0.0)
        following = (1.0 + np.sqrt(1.0 + 4.0 * weight**2)) / 2.0
        momentum = reached + (weight - 1.0) / following * (reached - errors)
        errors, weight = reached, following
    return errors


def proposal(evidence: Evidence, criterion: Criterion, rows: int, known: Allowed) -> tuple[int, ...]:
    """A set to begin with: the largest robust errors, as many as half the degrees of freedom, thinned out.

    What is `known` already helps to find the robust errors; they do not depend on it.
    """
    errors = np.abs(robust_errors(evidence, rows, known))
    order = np.argsort(-errors, kind="stable")[: evidence.freedom]
    chosen = sound(evidence, order[errors[order] > 0.0].tolist())
    return thinned(evidence.allowing(chosen), criterion)


def thinned(allowed: Allowed, criterion: Criterion) -> tuple[int, ...]:
    """What is left when the least significant of the chosen is dropped again and again, until none costs more than it
    explains."""
    while allowed.chosen:
        least = int(np.argmin(allowed.losses))
        fewer = allowed.without(allowed.chosen[least])
        if criterion.cost(allowed) < criterion.cost(fewer):
            return allowed.chosen
        allowed = fewer
    return ()
