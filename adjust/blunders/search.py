"""The set of errors that costs least: snooping with look-back, and pairs at once where errors mask each other.

To a set the best further error joins, or the best further pair; when none is worth it, others take the place of each
member in turn, and of two that lean on each other; until no set in reach costs less. All of it is algebra on scores
and information (`adjust.blunders.evidence`): no adjustment is repeated.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.criterion import Criterion
from adjust.blunders.evidence import LEAST_APART, Allowed, Evidence

LEAST_SAVING = 1e-9
"""Of cost: below it a move is rounding, and could be undone by the next."""


COUPLED = 0.05
"""Correlation of two estimated errors below which neither can stand in for a part of the other."""


MOST_PAIRED = 400
"""Columns that pairs are made of at most: 80,000 pairs, a few milliseconds' work."""

MOST_COUPLED = 30
"""Pairs of members that are looked at together, so that a badly wrecked job does not take minutes."""


@dataclass(frozen=True)
class Choice:
    """Hypotheses in ascending order and what they cost together."""

    cost: float
    chosen: tuple[int, ...]


def find_errors(evidence: Evidence, criterion: Criterion, start: Sequence[int] = ()) -> Choice:
    """The set of least cost that the moves reach from `start`."""
    search = _Search(evidence, criterion)
    allowed = evidence.allowing(tuple(sorted(start)))
    best, effort = Choice(criterion.cost(allowed), allowed.chosen), 0
    while effort < len(search.efforts):
        reached = search.efforts[effort](allowed)
        following = min(reached, key=lambda choice: (choice.cost, choice.chosen), default=best)
        if following.cost < best.cost - LEAST_SAVING:
            best, effort = following, 0
            allowed = evidence.allowing(best.chosen)
        else:
            effort += 1
    return best


@dataclass(frozen=True)
class _Search:
    evidence: Evidence
    criterion: Criterion

    @property
    def efforts(self) -> tuple[Callable[[Allowed], Iterator[Choice]], ...]:
        """Moves in the order of the work they take."""
        return self._one_more, self._two_more, self._exchanged, self._two_exchanged

    def _one_more(self, allowed: Allowed) -> Iterator[Choice]:
        """The best hypothesis of each sort on top."""
        for (width, _), numbers in self.evidence.sorts.items():
            gains = allowed.gains[numbers]
            if gains.max(initial=0.0) > 0.0 and self._has_room(allowed, width):
                best = int(np.argmax(gains))
                yield self._with(allowed, float(gains[best]), [int(numbers[best])])

    def _two_more(self, allowed: Allowed) -> Iterator[Choice]:
        """The best pair of single-column hypotheses of each two sorts on top."""
        if not self._has_room(allowed, 2):
            return
        columns = pair_columns(allowed)
        owners = self.evidence.owner[columns]
        shared = self.evidence.shared[owners]
        joint = pair_gains(allowed, columns)
        for first, second in ((~shared, ~shared), (~shared, shared), (shared, shared)):
            among = np.where(first[:, None] & second[None, :], joint, 0.0)
            if among.max(initial=0.0) > 0.0:
                i, k = divmod(int(np.argmax(among)), len(columns))
                yield self._with(allowed, float(among[i, k]), [int(owners[i]), int(owners[k])])

    def _has_room(self, allowed: Allowed, columns: int) -> bool:
        """Whether errors in so many more columns leave more to test than they take."""
        return len(allowed.columns) + columns <= most_columns(self.evidence)

    def _exchanged(self, allowed: Allowed) -> Iterator[Choice]:
        """Without one, or with one or two others in its place."""
        for removed in allowed.chosen:
            fewer = allowed.without(removed)
            yield Choice(self.criterion.cost(fewer), fewer.chosen)
            yield from self._one_more(fewer)
            yield from self._two_more(fewer)

    def _two_exchanged(self, allowed: Allowed) -> Iterator[Choice]:
        """One or two others in the place of two that lean on each other."""
        for first, second in coupled_pairs(allowed):
            fewer = allowed.without(first).without(second)
            yield from self._one_more(fewer)
            yield from self._two_more(fewer)

    def _with(self, allowed: Allowed, gain: float, joining: Sequence[int]) -> Choice:
        chosen = tuple(sorted((*allowed.chosen, *joining)))
        price = self.criterion.price(allowed.sorts + self.evidence.sorts_of(joining))
        return Choice(float(self.criterion.worth(allowed.statistic + gain)) + price, chosen)


def most_columns(evidence: Evidence) -> int:
    """Columns that a set may have: half of the degrees of freedom. With more, sets of all sorts explain everything."""
    return max(evidence.freedom // 2, 1)


def sound(evidence: Evidence, hypotheses: Sequence[int]) -> tuple[int, ...]:
    """Those of the hypotheses, the first first, that can be told from those before them, ascending."""
    allowed = evidence.by_itself
    for hypothesis in dict.fromkeys(hypotheses):
        columns = evidence.columns_of(hypothesis)
        fits = len(allowed.columns) + len(columns) <= most_columns(evidence)
        if fits and not np.isin(columns, allowed.columns).any() and allowed.testable[columns].all():
            allowed = evidence.allowing(tuple(sorted((*allowed.chosen, hypothesis))))
    return allowed.chosen


def pair_columns(allowed: Allowed) -> IntArray:
    """The columns (k,) that pairs are made of: those that fit worst, `MOST_PAIRED` at most."""
    candidates = allowed.possible & (allowed.evidence.owner >= 0)
    candidates[allowed.columns] = False
    columns = np.flatnonzero(candidates)
    if len(columns) <= MOST_PAIRED:
        return columns
    return np.sort(columns[np.argsort(-np.abs(allowed.w[columns]), kind="stable")[:MOST_PAIRED]])


def coupled_pairs(allowed: Allowed) -> list[tuple[int, int]]:
    """Pairs of the chosen whose estimated errors are correlated by more than `COUPLED`, closest first, `MOST_COUPLED`
    at most."""
    scale = np.sqrt(np.diagonal(allowed.covariance))
    correlation = np.abs(allowed.covariance) / np.outer(scale, scale)
    own = {chosen: allowed.own(chosen) for chosen in allowed.chosen}
    pairs = [(float(correlation[own[one], own[two]].max()), one, two) for one, two in combinations(allowed.chosen, 2)]
    close = sorted((-coupling, one, two) for coupling, one, two in pairs if coupling > COUPLED)
    return [(one, two) for _, one, two in close[:MOST_COUPLED]]


def pair_gains(allowed: Allowed, columns: IntArray) -> FloatArray:
    """T (k, k) of every pair of `columns` (k,) on top; 0 where the two can not be told apart."""
    scale = np.sqrt(allowed.diagonal[columns])
    w = allowed.w[columns]
    correlation = allowed.block(columns) / np.outer(scale, scale)
    np.fill_diagonal(correlation, 1.0)
    apart = 1.0 - correlation**2
    share = allowed.diagonal[columns] / allowed.evidence.information.diagonal[columns]
    left = apart * np.minimum(share[:, None], share[None, :])
    # Not w₁² + w₂² − 2ρw₁w₂ over 1 − ρ², which would lose the small error beside a gross one.
    second = (w[None, :] - correlation * w[:, None]) ** 2 / np.where(apart > 0.0, apart, 1.0)
    return np.where(left > LEAST_APART, w[:, None] ** 2 + second, 0.0)
