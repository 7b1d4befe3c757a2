"""Other ways to find blunders, on the same jobs: plain snooping, robust regression, and the limit.

Each returns the lines of the book that it takes to be wrong. They test what the search tests in single lines: every
component, and every vector as a whole.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations_with_replacement

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.criterion import chi_square_price
from adjust.quality import critical_w
from tests.studies.blunder_networks import Network, Planted

LEAST_APART = 1e-4
"""Share of its information that an error has to keep beside others: as in the search."""

AT_ONCE = 60_000
"""Numbers in one array: what a processor keeps at hand."""

Sets = dict[int, IntArray]
"""Supposed errors by their number of columns q: the columns (m, q) of each."""


@dataclass(frozen=True)
class Scores:
    """Score (p, n) and information (p, n, n) of p cases, every column in the sd of its error."""

    score: FloatArray
    information: FloatArray

    @classmethod
    def of(cls, job: Planted) -> Scores:
        """The one case of a job with nothing allowed for."""
        network = job.network
        scale = 1.0 / np.sqrt(np.diagonal(network.information))
        residual = job.observed - network.orthonormal @ (network.orthonormal.T @ job.observed)
        score = np.asarray(network.hypotheses.columns[:, : network.rows].T @ residual) * scale
        return cls(score[None], (network.information * np.outer(scale, scale))[None])

    def allowing(self, columns: IntArray) -> Scores:
        """Of one case as many as there are sets of `columns` (p, s) to allow for."""
        information, score = self.information[0], self.score[0]
        own = information[columns[:, :, None], columns[:, None, :]]
        influence = np.linalg.solve(own, information[columns])
        taken = np.einsum("ps,psn->pn", score[columns], influence)
        return Scores(score - taken, information - information[columns].transpose(0, 2, 1) @ influence)

    def gains(self, members: IntArray) -> FloatArray:
        """T (p, m) of each of `members` (m, q)."""
        blocks = self.information[:, members[:, :, None], members[:, None, :]]
        return _statistic(self.score[:, members], blocks)

    def pair_gains(self, first: IntArray, second: IntArray) -> FloatArray:
        """T (p, m, k) of `first` (m, q) and `second` (k, r) together; 0 where they can not be told apart."""
        if first.shape[1] == second.shape[1] == 1:
            return self._pairs_of_columns(first[:, 0], second[:, 0])
        own = self.information[:, first[:, :, None], first[:, None, :]]
        across = self.information[:, first[:, :, None]][..., second]
        regular = _regular(own)
        inverse = np.linalg.inv(np.where(regular[..., None, None], own, np.eye(first.shape[1])))
        turned = np.einsum("pmij,pmjks->pmiks", inverse, across[:, :, :, 0])
        score = self.score[:, None, second] - np.einsum("pmi,pmiks->pmks", self.score[:, first], turned)
        blocks = self.information[:, second[:, :, None], second[:, None, :]][:, None]
        blocks = blocks - np.einsum("pmikr,pmiks->pmkrs", across[:, :, :, 0], turned)
        gains = self.gains(first)[:, :, None] + _statistic(score, blocks)
        return np.where(regular[:, :, None] & _regular(blocks), gains, 0.0)

    def _pairs_of_columns(self, first: IntArray, second: IntArray) -> FloatArray:
        variance = np.einsum("pnn->pn", self.information)
        sound = variance > LEAST_APART
        scale = np.where(sound, 1.0 / np.sqrt(np.where(sound, variance, 1.0)), 0.0)
        w = self.score * scale
        correlation = self.information[:, first[:, None], second]
        correlation *= scale[:, first, None]
        correlation *= scale[:, None, second]
        left = 1.0 - correlation**2
        left *= variance[:, None, second]
        regular = left > LEAST_APART
        apart = np.where(regular, left, 1.0)
        apart /= np.where(sound, variance, 1.0)[:, None, second]
        correlation *= -w[:, first, None]
        correlation += w[:, None, second]
        np.square(correlation, out=correlation)
        correlation /= apart
        correlation += w[:, first, None] ** 2
        correlation *= regular
        return correlation


def _regular(blocks: FloatArray) -> FloatArray:
    determinant = blocks[..., 0, 0] if blocks.shape[-1] == 1 else np.linalg.det(blocks)
    return np.asarray(determinant > LEAST_APART)


def _statistic(score: FloatArray, blocks: FloatArray) -> FloatArray:
    """gᵀG⁻¹g; 0 where G is singular."""
    regular = _regular(blocks)
    sound = np.where(regular[..., None, None], blocks, np.eye(blocks.shape[-1]))
    if blocks.shape[-1] == 1:
        return np.asarray(np.where(regular, score[..., 0] ** 2 / sound[..., 0, 0], 0.0))
    solved = np.linalg.solve(sound, score[..., None])[..., 0]
    return np.where(regular, np.einsum("...i,...i->...", score, solved), 0.0)


def _prices(network: Network) -> dict[int, float]:
    significance = network.job.statistics.significance
    return {size: chi_square_price(significance, size) for size in network.members}


def _lines(network: Network, chosen: list[IntArray]) -> frozenset[str]:
    return frozenset(network.sources[int(columns[0])] for columns in chosen)


def plain_snooping(job: Planted) -> frozenset[str]:
    """The worst test that fails, set aside; again without it; until none fails. No look back (Kok 1984)."""
    network, prices = job.network, _prices(job.network)
    begun, allowed, chosen = Scores.of(job), Scores.of(job), []
    while True:
        gains = {size: allowed.gains(members)[0] - prices[size] for size, members in network.members.items()}
        size = max(gains, key=lambda width: gains[width].max(initial=0.0))
        if gains[size].max(initial=0.0) <= 0.0:
            return _lines(network, chosen)
        chosen.append(network.members[size][int(np.argmax(gains[size]))])
        allowed = begun.allowing(np.unique(np.concatenate(chosen))[None])


def robust_regression(job: Planted, name: str) -> frozenset[str]:
    """statsmodels RLM with its own scale (normalised MAD), then residuals beyond the critical value of w."""
    import statsmodels.api as sm

    network = job.network
    norm = {"Huber": sm.robust.norms.HuberT, "bisquare": sm.robust.norms.TukeyBiweight}[name]()
    fit = sm.RLM(job.observed, network.hypotheses.system.matrix.toarray(), M=norm).fit()
    failed = np.abs(fit.resid) > critical_w(network.job.statistics.significance) * fit.scale
    return frozenset(network.sources[int(row)] for row in np.flatnonzero(failed))


def maximum_likelihood(job: Planted, most: int) -> frozenset[str]:
    """The set of least −T + price among all sets of up to `most` errors."""
    scores, prices = Scores.of(job), _prices(job.network)
    best = min(_best_sets(scores, job.network.members, prices, most), key=lambda found: found[0])
    return _lines(job.network, best[1])


def _best_sets(
    scores: Scores, supposed: Sets, prices: dict[int, float], most: int
) -> Iterator[tuple[float, list[IntArray]]]:
    """The best sets of each size and sort with their costs."""
    yield 0.0, []
    for size, members in supposed.items():
        gains = scores.gains(members)[0]
        best = int(np.argmax(gains))
        yield prices[size] - float(gains[best]), [members[best]]
    for before in range(most - 1):
        for begun in _begun(supposed, before):
            price = sum(prices[columns.shape[1]] for columns in begun)
            for cost, pair, place in _best_pairs(scores, supposed, prices, begun):
                yield cost + price, [*(columns[place] for columns in begun), *pair]


def _begun(supposed: Sets, count: int) -> Iterator[list[IntArray]]:
    """All sets of `count` supposed errors, by the sorts of their members: for each member its columns (sets, q)."""
    for sizes in combinations_with_replacement(sorted(supposed), count):
        if count < 2:
            yield [supposed[size] for size in sizes]
            continue
        one, two = (supposed[size] for size in sizes)
        i, k = (
            np.triu_indices(len(one), 1)
            if sizes[0] == sizes[1]
            else (index.ravel() for index in np.indices((len(one), len(two))))
        )
        apart = ~(one[i][:, :, None] == two[k][:, None, :]).any(axis=(1, 2))
        yield [one[i[apart]], two[k[apart]]]


def _best_pairs(
    scores: Scores, supposed: Sets, prices: dict[int, float], begun: list[IntArray]
) -> Iterator[tuple[float, list[IntArray], int]]:
    """The best two on top of any of `begun`, for each two sorts: cost without that of `begun`, the two, place there."""
    columns = np.concatenate(begun, axis=1) if begun else np.empty((1, 0), dtype=np.int64)
    own = scores.information[0][columns[:, :, None], columns[:, None, :]]
    places = np.flatnonzero(np.linalg.det(own) > LEAST_APART) if begun else np.arange(1)
    width = max(len(members) for members in supposed.values())
    step = max(AT_ONCE // width**2, 1)
    for first in range(0, len(places), step):
        here = places[first : first + step]
        allowed = scores.allowing(columns[here]) if begun else scores
        have = _statistic(scores.score[0][columns[here]], own[here]) if begun else np.zeros(1)
        for a, b in combinations_with_replacement(sorted(supposed, reverse=True), 2):
            gains = allowed.pair_gains(supposed[a], supposed[b]) + have[:, None, None]
            case, i, k = np.unravel_index(int(np.argmax(gains)), gains.shape)
            pair = [supposed[a][i], supposed[b][k]]
            yield prices[a] + prices[b] - float(gains[case, i, k]), pair, int(here[case])
