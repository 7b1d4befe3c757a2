"""How well the variance components of the groups are known, and how far they hang together.

With M the projection onto the residuals of the weighted system and D_k the rows of group k, the information of
restricted maximum likelihood on the logarithms of the variance factors is

    F_kl = ½ tr(M D_k M D_l)                                                                        (1)

(Patterson & Thompson 1971, *Biometrika* 58, 545–554; Koch 1999, *Parameter Estimation and Hypothesis Testing in Linear
Models*, section 3.6; both from memory). As M M = M, its rows sum to half of the redundancies r_k, which gives the
diagonal. The rest is ½ Σ |D_k M e|² over the unit vectors e of group l, exact for small groups; for large ones the mean
over random vectors of signs takes their place (Hutchinson 1989, *Communications in Statistics: Simulation* 18,
1059–1076; from memory).
"""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.solver import Factor

PROBED_ROWS = 2000
"""Rows times random vectors of a group: enough for 3 % of an off-diagonal element, of which sds feel half at most."""

FEWEST_PROBES = 2

SEED = 19_790_604
"""The same job has the same figures every time."""


def information(factor: Factor, group: IntArray, redundancy: FloatArray) -> FloatArray:
    """F (groups, groups) by (1).

    `group` (system rows,) is −1 where a row belongs to none, `redundancy` (groups,) the sum over its rows.
    """
    count = len(redundancy)
    sizes = np.bincount(group[group >= 0], minlength=count)
    shared = np.zeros((count, count))
    if count > 1:
        generator = np.random.default_rng(SEED)
        for number in range(count):
            shared[number] = _shared(factor, group, number, generator, count)
    smaller = sizes[:, None] <= sizes
    both = np.where(smaller, shared, shared.T)
    both = np.where(smaller & smaller.T, (shared + shared.T) / 2, both)
    np.fill_diagonal(both, 0.0)
    return both + np.diag(np.maximum(redundancy / 2 - both.sum(axis=1), 0.0))


def _shared(factor: Factor, group: IntArray, number: int, generator: np.random.Generator, count: int) -> FloatArray:
    """½ tr(M D_k M D_l) (groups k,) of the group l = `number`."""
    probe, share = _probes(np.flatnonzero(group == number), factor.matrix.shape[0], generator)
    seen = probe - factor.matrix @ factor.normal_solve(factor.matrix.T @ probe)
    inside = np.flatnonzero(group >= 0)
    sums = np.bincount(group[inside], np.sum(seen[inside] ** 2, axis=1), count)
    return np.asarray(share * sums / 2, dtype=np.float64)


def _probes(rows: IntArray, length: int, generator: np.random.Generator) -> tuple[FloatArray, float]:
    """Vectors (length, some) on a group's rows, and what the sum over them counts for."""
    wanted = max(FEWEST_PROBES, -(-PROBED_ROWS // max(len(rows), 1)))
    if len(rows) <= wanted:
        probe = np.zeros((length, len(rows)))
        probe[rows, np.arange(len(rows))] = 1.0
        return probe, 1.0
    probe = np.zeros((length, wanted))
    probe[rows] = generator.choice([-1.0, 1.0], (len(rows), wanted))
    return probe, 1.0 / wanted
