"""Which other explanations the data leave standing beside the one of least cost.

A set S' in which others stand in the place of some members of S is left standing when each of its members fails its
own test, and the members of S that it lacks pass theirs once S' is allowed for: the truth is struck off only when its
own correct model fails a test, once in 1/significance cases. The closer the correlation of two test statistics, the
oftener one stands in for the other (Förstner 1983, *Reliability and discernability of extended Gauss–Markov models*,
Deutsche Geodätische Kommission A 98; Yang, Wang, Knight & Shen 2013, *Journal of Geodesy* 87).

Sets of as many errors that fit equally well are told apart by nothing but their size: the smallest errors, each
measured in its own minimal detectable bias, are named. Errors at one mark of a few lines are of that kind: any two of
three say the same.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from adjust.blunders.criterion import Criterion, chi_square_price
from adjust.blunders.evidence import Allowed, Evidence
from adjust.blunders.search import coupled_pairs, pair_columns, pair_gains

EQUAL = 1.0
"""Difference of T within which two sets fit equally well: a likelihood ratio of 1.6, which convinces nobody."""


BETTER = 3.84
"""By how much T of two errors has to pass that of one in whose place they may stand: χ²(0.95; 1). Two fit better than
one in any case; by less it means nothing."""

MOST_PAIRS = 100
"""Pairs that are looked at in the place of two members, the likeliest first."""


@dataclass(frozen=True)
class Replacement:
    """`joined` hypotheses that stand in for `removed` ones of a set, and the set that results, ascending."""

    removed: tuple[int, ...]
    joined: tuple[int, ...]
    chosen: tuple[int, ...]


def smallest(
    evidence: Evidence, chosen: tuple[int, ...], replacements: Sequence[Replacement], least: float
) -> tuple[int, ...]:
    """Of a set and those that `replacements` make of it by as many errors, with T of `least` or more, that of the
    smallest errors."""
    equal = [
        replacement.chosen
        for replacement in replacements
        if evidence.sorts_of(replacement.joined) == evidence.sorts_of(replacement.removed)
        and evidence.allowing(replacement.chosen).statistic >= least
    ]
    return min([chosen, *equal], key=lambda one: (size_of_errors(evidence.allowing(one)), one))


def size_of_errors(allowed: Allowed) -> float:
    """Square sum of the chosen errors, each in the sd it would have if it were the only one."""
    own = allowed.evidence.information.diagonal[allowed.columns]
    return float(np.sum(own * allowed.errors**2))


def standing(evidence: Evidence, criterion: Criterion, chosen: tuple[int, ...]) -> Iterator[Replacement]:
    """Every replacement of one member by one other or by two, and of two by two, that the tests let stand."""
    allowed = evidence.allowing(chosen)
    for removed in chosen:
        one = _Standing(criterion, allowed, (removed,))
        yield from one.by_one()
        yield from one.by_two(better=BETTER)
    for pair in coupled_pairs(allowed):
        yield from _Standing(criterion, allowed, pair).by_two(better=-chi_square_price(criterion.significance, 2))


class _Standing:
    """What may stand in the place of `removed` members of a set."""

    def __init__(self, criterion: Criterion, allowed: Allowed, removed: tuple[int, ...]) -> None:
        self.evidence, self.criterion, self.removed = allowed.evidence, criterion, removed
        self.variance = criterion.variance(allowed.statistic, len(allowed.columns))
        for gone in removed:
            allowed = allowed.without(gone)
        self.allowed, self.kept = allowed, allowed.chosen

    def by_one(self) -> Iterator[Replacement]:
        """One other for the one removed: it pays, and explains almost as much, or the one removed would be missed."""
        most = self.allowed.joint_gain(self.removed)
        kept, gone = self.allowed.sorts, self.evidence.sorts_of(self.removed)
        for sort, numbers in self.evidence.sorts.items():
            gains = self.allowed.gains[numbers]
            cost = self.criterion.worth(self.allowed.statistic + gains) + self.criterion.price(kept + Counter([sort]))
            alone = self._cost(0.0, ())
            missed = float(self.criterion.worth(self.allowed.statistic + most))
            enough = (cost < alone) & (cost <= missed + self.criterion.price(kept + gone + Counter([sort])))
            for place in np.flatnonzero(enough & (gains > 0.0) & ~np.isin(numbers, self.removed)).tolist():
                yield from self._if_standing((int(numbers[place]),), float(gains[place]))

    def by_two(self, better: float) -> Iterator[Replacement]:
        """Two other single columns for those removed, likeliest first, at most `MOST_PAIRS`.

        Their T passes that of the removed ones by at least `better`.
        """
        columns = pair_columns(self.allowed)
        owners = self.evidence.owner[columns]
        gains = np.triu(pair_gains(self.allowed, columns), 1)
        same = np.isin(owners, self.removed)
        gains[same[:, None] | same[None, :]] = 0.0
        first, second = np.nonzero(gains > max(self.allowed.joint_gain(self.removed) + better * self.variance, 0.0))
        order = np.argsort(-gains[first, second], kind="stable")[:MOST_PAIRS]
        single = self.allowed.w[columns] ** 2
        for i, k in zip(first[order].tolist(), second[order].tolist(), strict=True):
            gain, pair = float(gains[i, k]), (int(owners[i]), int(owners[k]))
            if self._pays(float(max(single[i], single[k])), gain, pair[:1], pair):
                yield from self._if_standing(pair, gain)

    def _if_standing(self, joined: tuple[int, ...], gain: float) -> Iterator[Replacement]:
        """The replacement, if the removed members explain nothing on top of it."""
        together = self.allowed.joint_gain((*joined, *self.removed))
        if not self._pays(gain, together, joined, (*joined, *self.removed)):
            yield Replacement(self.removed, joined, tuple(sorted((*self.kept, *joined))))

    def _pays(self, before: float, after: float, fewer: tuple[int, ...], more: tuple[int, ...]) -> bool:
        """Whether `more` hypotheses beside the kept ones are worth more than `fewer`, given what each explains."""
        return self._cost(after, more) < self._cost(before, fewer)

    def _cost(self, gain: float, joined: tuple[int, ...]) -> float:
        price = self.criterion.price(self.allowed.sorts + self.evidence.sorts_of(joined))
        return float(self.criterion.worth(self.allowed.statistic + gain)) + price
