"""The scale of the residuals of each group, by all of them, or so that no single one weighs much.

With ε the whitened residuals of an observation of m components, M their cofactor matrix (M = I − Ã C Ãᵀ of its rows,
its trace the redundancy r) and T = εᵀM⁻¹ε, which is χ² of m degrees of freedom (w² where m = 1), the factor s² of a
group solves

    Σ |ε|² min(1/s², c²/T) = Σ β r,    β = E min(T, c²) / m                                        (1)

Without a bound c it is vᵀPv / Σr, the almost unbiased estimate of Förstner (1979, *Ein Verfahren zur Schätzung von
Varianz- und Kovarianzkomponenten*, Allgemeine Vermessungs-Nachrichten 86, 446–453; from memory). With one it is
Proposal 2 of Huber (1964, *Annals of Mathematical Statistics* 35, 73–101, section 9; from memory) for the normalised
residuals, each with the share r that it has in the degrees of freedom; robust likelihoods of variance components bound
residuals so (Richardson & Welsh 1995, *Biometrics* 51, 1429–1439; from memory).
"""

from __future__ import annotations

from functools import cache

import numpy as np
from scipy.special import gammainc, gammaincc, gammainccinv

from adjust.arrays import FloatArray, IntArray

BOUND = 2.5
"""c of a single residual: one that is larger counts as one of 2.5 sds. On normal errors it adds 4 % to the variance of
the estimate; the worst blunder adds no more than c² = 6.25 to a sum of squares."""

STEPS = 60
STILL = 1e-9
"""Steps of the fixed point (1) at most, and the relative change of s² at which it has settled."""

SMALLEST = 1e-8
"""Of s²: residuals that vanish tell of exact data, not of a precision."""


@cache
def bound(components: int) -> float:
    """c² of T with so many components: left with the same probability as `BOUND` by one residual."""
    return float(2 * gammainccinv(components / 2, gammaincc(0.5, BOUND**2 / 2)))


@cache
def consistency(components: int) -> float:
    """β = E min(T, c²) / m for T of χ² with m degrees of freedom."""
    half, c = components / 2, bound(components)
    return float(gammainc(half + 1, c / 2) + c * gammaincc(half, c / 2) / components)


@cache
def inefficiency(components: int) -> float:
    """By how much the variance of ln s² exceeds that of the unbounded estimate on normal errors.

    An M-estimate of scale with χ(T) = min(T, c²) − mβ has the asymptotic variance E χ² / (E Tχ′)² (Huber 1981, *Robust
    Statistics*, section 5.2; from memory); unbounded it is 2/m.
    """
    m, c, half = components, bound(components), components / 2
    square = m * (m + 2) * gammainc(half + 2, c / 2) + c**2 * gammaincc(half, c / 2)
    slope = m * gammainc(half + 1, c / 2)
    return float((square - (m * consistency(m)) ** 2) / slope**2 * m / 2)


def plain_scales(energy: FloatArray, redundancy: FloatArray, group: IntArray, groups: int) -> FloatArray:
    """s² (groups,) of all residuals: Σ|ε|² over Σr; NaN where nothing is checked. Arrays (observations,)."""
    total = np.bincount(group, redundancy, groups)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.maximum(np.bincount(group, energy, groups) / total, SMALLEST)


def bounded_scales(
    energy: FloatArray, test: FloatArray, redundancy: FloatArray, components: IntArray, group: IntArray, groups: int
) -> FloatArray:
    """s² (groups,) by (1). All but `groups` are arrays (observations,): |ε|², T, r, m and the group of each."""
    sizes = np.arange(1, int(components.max(initial=1)) + 1).tolist()
    most = np.array([np.nan, *map(bound, sizes)])[components]
    share = np.array([np.nan, *map(consistency, sizes)])[components]
    expected = np.bincount(group, redundancy * share, groups)
    with np.errstate(invalid="ignore", divide="ignore"):
        cap = np.where(test > 0, most / test, np.inf)
        square = plain_scales(energy, redundancy, group, groups)
        for _ in range(STEPS):
            before = square
            found = np.bincount(group, energy * np.minimum(1.0 / square[group], cap), groups) / expected
            square = np.maximum(square * found, SMALLEST)
            if np.nanmax(np.abs(square / before - 1.0), initial=0.0) < STILL:
                break
    return square
