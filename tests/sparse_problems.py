"""Random sparse least-squares problems for the tests of the solver, and their dense solutions."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse

from adjust.arrays import FloatArray, IntArray
from adjust.solver import Factor, analyse


@dataclass(frozen=True)
class Problem:
    """A problem min |A x − b| with the group of each column and where the groups lie."""

    dense: FloatArray
    right_side: FloatArray
    groups: IntArray
    positions: FloatArray | None

    @cached_property
    def matrix(self) -> scipy.sparse.csr_array:
        return scipy.sparse.csr_array(self.dense)

    def factor(self) -> Factor:
        return analyse(self.matrix, self.groups, self.positions).factorise(self.matrix, self.right_side)

    @cached_property
    def norms(self) -> FloatArray:
        return np.linalg.norm(self.dense, axis=0)

    @cached_property
    def scaled(self) -> FloatArray:
        """A with columns of unit norm: in these units every tolerance is a share of the largest figure."""
        return self.dense / self.norms

    @cached_property
    def condition(self) -> float:
        return float(np.linalg.cond(self.scaled))

    @cached_property
    def scaled_solution(self) -> FloatArray:
        return np.linalg.lstsq(self.scaled, self.right_side, rcond=None)[0]

    @cached_property
    def scaled_covariance(self) -> FloatArray:
        inverse = np.linalg.pinv(self.scaled)
        return inverse @ inverse.T

    @cached_property
    def leverage(self) -> FloatArray:
        """Squared row norms of Q."""
        return np.sum(np.linalg.qr(self.scaled)[0] ** 2, axis=1)

    @cached_property
    def sharing(self) -> tuple[IntArray, IntArray]:
        """All pairs of columns that share a row or a group."""
        pattern = (self.dense != 0).astype(float)
        return np.nonzero((pattern.T @ pattern > 0) | (self.groups[:, None] == self.groups))


def network(
    marks: int,
    *,
    seed: int,
    parts: int = 1,
    long_sides: int = 0,
    common: int = 0,
    spread: float = 0.0,
    positions: bool = True,
) -> Problem:
    """Marks at random in `parts` unconnected areas, rows between near ones and some far ones, columns of any scale.

    Each mark has one to three columns; `common` more columns stand in every other row, in a group of their own;
    column scales range over 10^±spread.
    """
    generator = np.random.default_rng(seed)
    places = generator.uniform(0.0, 1.0, (marks, 2))
    part = generator.integers(0, parts, marks)
    sides = near_pairs(places, part, 3)
    far = generator.integers(0, marks, (long_sides, 2))
    sides = np.concatenate([sides, far[part[far[:, 0]] == part[far[:, 1]]]])
    sizes = generator.integers(1, 4, marks)
    groups = np.concatenate([np.repeat(np.arange(marks), sizes), np.full(common, marks)])
    rows = [np.isin(groups, pair) for pair in sides for _ in range(2)]
    rows += [groups == mark for mark in range(0, marks, 5) for _ in range(3)]
    mask = np.array(rows)
    mask[::2, groups == marks] = True
    dense = np.where(mask, generator.standard_normal(mask.shape), 0.0)
    dense *= 10.0 ** generator.uniform(-spread, spread, len(groups))
    where = np.vstack([places, [[0.5, 0.5]]]) if positions else None
    return Problem(dense, generator.standard_normal(len(dense)), groups, where)


def near_pairs(places: FloatArray, part: IntArray, neighbours: int) -> IntArray:
    """Each mark with its nearest marks of the same part, and with the next mark of its part."""
    distance = np.linalg.norm(places[:, None] - places, axis=2)
    distance[part[:, None] != part] = np.inf
    np.fill_diagonal(distance, np.inf)
    pairs = []
    for mark in range(len(places)):
        near = np.argsort(distance[mark])[:neighbours]
        pairs += [(mark, other) for other in near if np.isfinite(distance[mark, other])]
        later = np.flatnonzero(part[mark + 1 :] == part[mark])
        pairs += [(mark, mark + 1 + later[0])] if len(later) else []
    return np.array(pairs, dtype=np.int64).reshape(-1, 2)
