"""Snooping in networks too large to hold all of G: in strides over the whole, then closely where that finds errors."""

from __future__ import annotations

from collections import Counter

import numpy as np

from adjust.arrays import IntArray
from adjust.blunders.criterion import Criterion
from adjust.blunders.evidence import Allowed, Evidence
from adjust.blunders.hypotheses import MOST_DENSE, Hypotheses
from adjust.blunders.proposals import thinned
from adjust.blunders.search import COUPLED, most_columns, sound

STRIDE = 40
"""Rows that may join together: as many as it takes to find most blunders of a large network at once."""

LEAST_LEANING, LEAST_FAILING = 0.2, 0.5
"""Correlation with an error found, or share of the critical value, from which on a row is looked at closely. One that
leans less stands in for no error that is not itself near its critical value."""

MOST_CONSIDERED = MOST_DENSE // 2
"""Rows looked at closely, which leaves as many columns to the groups that they belong to."""


def snooped(evidence: Evidence, criterion: Criterion, start: tuple[int, ...] = ()) -> tuple[int, ...]:
    """Data snooping in strides: in each, the worst single rows that do not lean on each other join together.

    Blunders far apart have nothing to do with each other, so that a large network needs few strides.
    """
    allowed = evidence.allowing(sound(evidence, start))
    while True:
        joining = _joining(allowed, criterion)
        if not joining or len(allowed.columns) + len(joining) > most_columns(evidence):
            return thinned(allowed, criterion)
        allowed = evidence.allowing(tuple(sorted((*allowed.chosen, *joining))))


def _joining(allowed: Allowed, criterion: Criterion) -> list[int]:
    """Single rows that fail their test, worst first, at most `STRIDE`, none correlated with one before it."""
    evidence = allowed.evidence
    singles = evidence.sorts[1, False]
    columns = evidence.members[1][evidence.place[singles], 0]
    gains = allowed.w[columns] ** 2
    gains[np.isin(singles, allowed.chosen)] = 0.0
    pays = criterion.worth(allowed.statistic + gains) + criterion.price(
        allowed.sorts + Counter([(1, False)])
    ) < criterion.cost(allowed)
    failed = np.flatnonzero(pays)
    worst = failed[np.argsort(-gains[failed], kind="stable")[:STRIDE]]
    block = allowed.block(columns[worst])
    scale = np.sqrt(np.diagonal(block))
    correlation = np.abs(block) / np.outer(scale, scale)
    taken: list[int] = []
    for place in range(len(worst)):
        if not taken or correlation[place, taken].max() < COUPLED:
            taken.append(place)
    return [int(number) for number in singles[worst[taken]]]


def considered(hypotheses: Hypotheses, allowed: Allowed, criterion: Criterion) -> IntArray:
    """System rows, ascending, to look at closely: those that lean on an error found, or fit badly beside all of them.

    Correlated observations come whole.
    """
    evidence, rows = allowed.evidence, hypotheses.rows
    by_itself = evidence.information.diagonal
    strips = np.abs(evidence.information.columns(allowed.columns)[:rows])
    strips /= np.sqrt(np.maximum(by_itself[:rows, None], np.finfo(float).tiny))
    leaning = np.max(strips / np.sqrt(by_itself[allowed.columns]), axis=1, initial=0.0) / LEAST_LEANING
    failing = np.abs(allowed.w[:rows]) / criterion.critical((1, False), evidence.freedom) / LEAST_FAILING
    relevance = np.where(evidence.by_itself.testable[:rows], np.maximum(leaning, failing), 0.0)
    relevance[allowed.columns[allowed.columns < rows]] = np.inf
    worst = np.argsort(-relevance, kind="stable")[: max(MOST_CONSIDERED, len(allowed.columns))]
    return hypotheses.whole_observations(worst[relevance[worst] >= 1.0])
