"""What the residuals say of errors supposed anywhere: scores and information of all of them, in closed form.

Whitened, the observations minus what the adjustment makes of them are e = M ε, M = I − Ã C Ãᵀ. Errors of sizes ∇ in the
columns H enter as M H ∇, so that with the score g = Hᵀe and the information G = HᵀMH

    ∇ = G⁻¹ g,   Q_∇ = G⁻¹,   T = gᵀ G⁻¹ g                                                           (1)

is what vᵀPv falls by when the errors are allowed for: χ² of as many degrees of freedom as columns when there are none
(Teunissen 2006, *Testing theory*, 2nd edition, Delft, §4; Kok 1984, *On data snooping and multiple outlier testing*,
NOAA Technical Report NOS NGS 30). Allowing for some errors S changes the rest to

    g|S = g − G_·S G_SS⁻¹ g_S,   G|S = G − G_·S G_SS⁻¹ G_S·                                          (2)

without another adjustment.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.blunders.information import InformationMatrix

LEAST_INFORMATION = 1e-6
"""Share of its weight hᵀh below which an error can not be told from the unknowns: it would show by less than a
thousandth of itself in the residuals."""

LEAST_APART = 1e-4
"""Share of the information it has by itself below which an error can not be told from other errors: one in a hundred of
its size would pass for it."""


Sort = tuple[int, bool]
"""Number of columns of a hypothesis, and whether it is of a group."""


@dataclass(frozen=True)
class Evidence:
    """Scores g and information G of all supposed errors.

    `members` lists for each number q of columns the hypotheses that have so many, (m, q) indices of columns, and
    `numbers` their numbers (m,) among all hypotheses; `shared` (hypotheses,) are those of groups. `limits` (columns, 2)
    are the least and the largest error that can be; `weight` (columns,) is hᵀh. `square_sum` is eᵀe = vᵀPv, of
    `freedom` degrees.
    """

    score: FloatArray
    information: InformationMatrix
    limits: FloatArray
    weight: FloatArray
    members: dict[int, IntArray]
    numbers: dict[int, IntArray]
    shared: BoolArray
    square_sum: float
    freedom: int

    @cached_property
    def count(self) -> int:
        """Number of hypotheses."""
        return sum(len(rows) for rows in self.numbers.values())

    @cached_property
    def size(self) -> IntArray:
        """Columns (hypotheses,) of each hypothesis."""
        size = np.zeros(self.count, dtype=np.int64)
        for width, numbers in self.numbers.items():
            size[numbers] = width
        return size

    @cached_property
    def sorts(self) -> dict[Sort, IntArray]:
        """Numbers of the hypotheses of each sort."""
        return {
            (width, shared): numbers[self.shared[numbers] == shared]
            for width, numbers in self.numbers.items()
            for shared in (False, True)
        }

    def sort(self, hypothesis: int) -> Sort:
        """Number of columns, and whether it is of a group."""
        return int(self.size[hypothesis]), bool(self.shared[hypothesis])

    def sorts_of(self, hypotheses: Iterable[int]) -> Counter[Sort]:
        """How many of some hypotheses are of each sort."""
        return Counter(map(self.sort, hypotheses))

    @cached_property
    def place(self) -> IntArray:
        """Row (hypotheses,) of each hypothesis among those of its size."""
        place = np.zeros(self.count, dtype=np.int64)
        for numbers in self.numbers.values():
            place[numbers] = np.arange(len(numbers))
        return place

    @cached_property
    def owner(self) -> IntArray:
        """The hypothesis (columns,) of that column alone, −1 where there is none."""
        owner = np.full(len(self.score), -1, dtype=np.int64)
        if 1 in self.members:
            owner[self.members[1][:, 0]] = self.numbers[1]
        return owner

    @cached_property
    def blocks(self) -> dict[int, FloatArray]:
        """Information (m, q, q) of the hypotheses of each number q of columns."""
        return {width: self.information.blocks(members) for width, members in self.members.items()}

    @cached_property
    def by_itself(self) -> Allowed:
        """The tests of each hypothesis with nothing else allowed for."""
        return self.allowing(())

    def columns_of(self, hypothesis: int) -> IntArray:
        """Columns (q,) of one hypothesis."""
        columns: IntArray = self.members[int(self.size[hypothesis])][self.place[hypothesis]]
        return columns

    def allowing(self, chosen: Sequence[int]) -> Allowed:
        """The tests of all others once the errors of `chosen` hypotheses, ascending, are allowed for.

        Raises numpy.linalg.LinAlgError where these can not be told apart.
        """
        owned = [self.columns_of(hypothesis) for hypothesis in chosen]
        columns = np.concatenate([np.empty(0, dtype=np.int64), *owned])
        scale = np.sqrt(self.information.diagonal[columns])
        own = self.information.block(columns, columns) / np.outer(scale, scale)
        lower = np.linalg.inv(np.linalg.cholesky(own)) / scale
        return Allowed(self, tuple(chosen), columns, lower.T @ lower)


@dataclass(frozen=True)
class Allowed:
    """Equation (2) for one set of hypotheses S, `chosen`, of `columns` (s,), with `covariance` Q_∇ = G_SS⁻¹ (s, s)."""

    evidence: Evidence
    chosen: tuple[int, ...]
    columns: IntArray
    covariance: FloatArray

    @cached_property
    def sorts(self) -> Counter[Sort]:
        """How many of each sort are chosen."""
        return self.evidence.sorts_of(self.chosen)

    @cached_property
    def errors(self) -> FloatArray:
        """∇ (s,) of the chosen, column by column."""
        return np.asarray(self.covariance @ self.evidence.score[self.columns], dtype=np.float64)

    @property
    def statistic(self) -> float:
        """T of the whole set."""
        return float(self.evidence.score[self.columns] @ self.errors)

    @cached_property
    def influence(self) -> FloatArray:
        """G_·S Q_∇ (columns, s): what each error takes from the score of every column."""
        return np.asarray(self.evidence.information.columns(self.columns) @ self.covariance, dtype=np.float64)

    @cached_property
    def score(self) -> FloatArray:
        """g|S (columns,)."""
        return np.asarray(self.evidence.score - self.influence @ self.evidence.score[self.columns], dtype=np.float64)

    @cached_property
    def diagonal(self) -> FloatArray:
        """Diagonal (columns,) of G|S."""
        taken = np.einsum("ps,ps->p", self.influence, self.evidence.information.columns(self.columns))
        return np.asarray(self.evidence.information.diagonal - taken, dtype=np.float64)

    def block(self, columns: IntArray) -> FloatArray:
        """G|S (k, k) among some columns (k,)."""
        information = self.evidence.information
        across = information.block(columns, self.columns)
        return np.asarray(information.block(columns, columns) - across @ self.covariance @ across.T, dtype=np.float64)

    @cached_property
    def testable(self) -> BoolArray:
        """Which columns (columns,) still show an error of their own."""
        by_itself = self.evidence.information.diagonal
        checked = by_itself > LEAST_INFORMATION * self.evidence.weight
        testable: BoolArray = checked & (self.diagonal > LEAST_APART * by_itself)
        return testable

    @cached_property
    def w(self) -> FloatArray:
        """Normalised score (columns,) of each column: standard normal when nothing more is wrong; 0 untestable."""
        return np.where(self.testable, self.score / np.sqrt(np.where(self.testable, self.diagonal, 1.0)), 0.0)

    @cached_property
    def possible(self) -> BoolArray:
        """Which columns (columns,) can be tested, and would by themselves be an error within their limits."""
        error, (least, largest) = self.score / np.where(self.testable, self.diagonal, 1.0), self.evidence.limits.T
        return np.asarray(self.testable & (least <= error) & (error <= largest), dtype=np.bool_)

    @cached_property
    def gains(self) -> FloatArray:
        """T (hypotheses,) of each hypothesis on top of the chosen ones; 0 for these, and where it can not be tested, or
        not be."""
        gains = np.zeros(self.evidence.count)
        for width, members in self.evidence.members.items():
            numbers = self.evidence.numbers[width]
            gains[numbers] = self._single(members[:, 0]) if width == 1 else self._joint(members)
        gains[list(self.chosen)] = 0.0
        return gains

    def _single(self, columns: IntArray) -> FloatArray:
        """T (m,) of hypotheses of one column (m,)."""
        return np.where(self.possible[columns], self.w[columns] ** 2, 0.0)

    def _joint(self, members: IntArray) -> FloatArray:
        """T (m,) of hypotheses of several columns (m, q)."""
        sound = self.testable[members].all(axis=1)
        tested = members[sound]
        across = self.evidence.information.block(tested.ravel(), self.columns)
        across = across.reshape(*tested.shape, len(self.columns))
        blocks = self.evidence.blocks[members.shape[1]][sound] - across @ self.covariance @ across.transpose(0, 2, 1)
        scale = np.sqrt(self.evidence.information.diagonal[tested])
        values, vectors = np.linalg.eigh(blocks / (scale[:, :, None] * scale[:, None, :]))
        turned = np.einsum("mij,mi->mj", vectors, self.score[tested] / scale)
        regular = values[:, 0] > LEAST_APART
        joint = np.zeros(len(members))
        joint[np.flatnonzero(sound)[regular]] = np.sum(turned[regular] ** 2 / values[regular], axis=1)
        return joint

    def joint_gain(self, hypotheses: Sequence[int]) -> float:
        """T of further hypotheses together on top; directions in which nothing more can be told count nothing."""
        columns = np.concatenate([self.evidence.columns_of(hypothesis) for hypothesis in hypotheses])
        scale = np.sqrt(self.evidence.information.diagonal[columns])
        values, vectors = np.linalg.eigh(self.block(columns) / np.outer(scale, scale))
        turned = vectors.T @ (self.score[columns] / scale)
        regular = values > LEAST_APART
        return float(np.sum(turned[regular] ** 2 / values[regular]))

    def own(self, hypothesis: int) -> slice:
        """Where one of the chosen stands among their columns."""
        before = self.chosen[: self.chosen.index(hypothesis)]
        first = int(self.evidence.size[list(before)].sum())
        return slice(first, first + int(self.evidence.size[hypothesis]))

    @cached_property
    def losses(self) -> FloatArray:
        """T (chosen,) of each of the chosen given the others: what vᵀPv rises by without it."""
        parts = [self.own(hypothesis) for hypothesis in self.chosen]
        return np.array(
            [self.errors[own] @ np.linalg.solve(self.covariance[own, own], self.errors[own]) for own in parts]
        )

    def without(self, hypothesis: int) -> Allowed:
        """The same without one of the chosen, found from this in one step."""
        own = self.own(hypothesis)
        kept = np.delete(np.arange(len(self.columns)), own)
        gone = np.linalg.solve(self.covariance[own, own], self.covariance[own, kept])
        covariance = self.covariance[np.ix_(kept, kept)] - self.covariance[kept, own] @ gone
        chosen = tuple(other for other in self.chosen if other != hypothesis)
        return _Without(self.evidence, chosen, self.columns[kept], covariance, self, own)


@dataclass(frozen=True)
class _Without(Allowed):
    """A set that lacks the columns `gone` J of a `fuller` one S: with K_J the influence of J there,

    g|R = g|S + K_J Q_JJ⁻¹ ∇_J,   G|R = G|S + K_J Q_JJ⁻¹ K_Jᵀ.
    """

    fuller: Allowed
    gone: slice

    @cached_property
    def score(self) -> FloatArray:
        """g|R (columns,)."""
        fuller = self.fuller
        returned = np.linalg.solve(fuller.covariance[self.gone, self.gone], fuller.errors[self.gone])
        return np.asarray(fuller.score + fuller.influence[:, self.gone] @ returned, dtype=np.float64)

    @cached_property
    def diagonal(self) -> FloatArray:
        """Diagonal (columns,) of G|R."""
        fuller = self.fuller
        influence = fuller.influence[:, self.gone]
        returned = np.linalg.solve(fuller.covariance[self.gone, self.gone], influence.T).T
        return np.asarray(fuller.diagonal + np.einsum("pq,pq->p", influence, returned), dtype=np.float64)
