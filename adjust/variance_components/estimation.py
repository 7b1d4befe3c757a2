"""Variance components by iteration: weights, fit, scale of each group, new weights.

The almost unbiased estimate σ²_k ← σ²_k · s²_k (Förstner 1979, see `scale`) comes to rest where vᵀPv = Σr in every
group, which is where the restricted likelihood is largest (Patterson & Thompson 1971, see `information`; from memory).
Groups that share much of their redundancy make it slow. Near the solution the step is therefore taken through the
information matrix F, ln σ² ← ln σ² + F⁻¹ (½ r ln s²), which is Fisher's scoring to first order.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.variance_components.fit import Weighted
from adjust.variance_components.groups import Group, enough, find_groups
from adjust.variance_components.information import information
from adjust.variance_components.outlying import Neighbours, set_aside, taken_back
from adjust.variance_components.scale import bounded_scales, inefficiency, plain_scales

MOST_STEPS = 25
"""Two or three are usual; more only where several blunders are peeled off each other."""

SETTLED = 0.1
"""A step below that many sds of ln σ² is the last: what would follow is of second order."""

SETTLED_AT_LEAST = 0.01
"""Nor does a step matter that changes a factor by less than half a per cent, whatever its sd."""

NEAR = 2.0
"""Of ln σ²: farther from the solution, where sds are wrong by a factor of three, the plain step is the safer one."""

SLIGHT = 1e-3
"""Of the observations of a group: so few that change sides move its factor by less than half a per cent."""

FARTHEST = 2 * np.log(100.0)
"""Of ln σ²: sds wrong by a factor of a hundred are another unit."""


@dataclass(frozen=True)
class Estimate:
    """Where the iteration came to rest; arrays (groups,), NaN where a group was not estimated.

    `logarithm` is that of the variance factor, `covariance` (groups, groups) its covariance. `aside` (observations,)
    took no part.
    """

    groups: tuple[Group, ...]
    redundancy: FloatArray
    logarithm: FloatArray
    covariance: FloatArray
    aside: BoolArray
    steps: int


def estimate(
    adjustment: Adjustment, without: Collection[str] = (), *, robust: bool = True, settled: float = SETTLED
) -> Estimate:
    """The iteration; a step below `settled` sds ends it."""
    return _Iteration(adjustment, without, robust, settled).run()


class _Iteration:
    def __init__(self, adjustment: Adjustment, without: Collection[str], robust: bool, settled: float) -> None:
        self.weighted = Weighted(adjustment)
        self.robust, self.settled = robust, settled
        kinds = [block.observations for block in self.weighted.blocks]
        self.fit = self.weighted.as_adjusted()
        self.groups = find_groups(kinds, self.fit.redundancy)
        self.group: IntArray = np.zeros(len(self.weighted.components), dtype=np.int64)
        for number, group in enumerate(self.groups):
            self.group[group.rows] = number
        self.free = enough(self.groups, self.fit.redundancy)
        self.logarithm = np.zeros(len(self.groups))
        self.named = _named(adjustment, without)
        self.aside = self.named.copy()
        self.returned = np.zeros_like(self.aside)
        self.neighbours = _neighbours(self.weighted, len(adjustment.job.marks))
        self.inverse = np.zeros((len(self.groups), len(self.groups)))

    def run(self) -> Estimate:
        """Until every step is small and no observation changes sides."""
        if self.aside.any():
            self._refit()
        for steps in range(1, MOST_STEPS + 1):
            square = self._squares()
            out, back = self._change_sides(square)
            if steps == MOST_STEPS or self._is_slight(out | back):
                step = self._step(square)
                self.logarithm = np.clip(self.logarithm + step, -FARTHEST, FARTHEST)
                if steps == MOST_STEPS or (self._is_small(step) and not out.any()):
                    break
            self._refit()
        return self._estimate(steps)

    def _estimate(self, steps: int) -> Estimate:
        loss = np.array([inefficiency(group.components) if self.robust else 1.0 for group in self.groups])
        known = np.where(self.free, self.logarithm, np.nan)
        covariance = np.where(self.free, self.inverse, np.nan) * np.sqrt(np.outer(loss, loss))
        return Estimate(self.groups, self._redundancy(), known, covariance, self.aside, steps)

    def _refit(self) -> None:
        self.fit = self.weighted.under(np.exp(self.logarithm / 2)[self.group], self.aside)

    def _squares(self) -> FloatArray:
        """s² (groups,) of each group, 1 where it is not estimated."""
        fit, count = self.fit, len(self.groups)
        if self.robust:
            components = np.maximum(fit.checked, 1)
            found = bounded_scales(fit.energy, fit.test, fit.redundancy, components, self.group, count)
        else:
            found = plain_scales(fit.energy, fit.redundancy, self.group, count)
        return np.where(self.free & np.isfinite(found), found, 1.0)

    def _change_sides(self, square: FloatArray) -> tuple[BoolArray, BoolArray]:
        """Set aside what stands too far off, take back what does not: which observations that were."""
        if not self.robust:
            return np.zeros_like(self.aside), np.zeros_like(self.aside)
        out = set_aside(self.fit, square, self.group, ~(self.aside | self.returned), self.neighbours)
        back = taken_back(self.fit, square, self.group, self.aside & ~self.named)
        self.returned |= back
        self.aside = (self.aside | out) & ~back
        return out, back

    def _is_slight(self, changed: BoolArray) -> bool:
        """Whether few observations changed sides in every group; where many did, s² is not yet that of the others."""
        count = len(self.groups)
        share = np.bincount(self.group[changed], minlength=count) / np.bincount(self.group, minlength=count)
        return bool(np.all(share <= SLIGHT))

    def _redundancy(self) -> FloatArray:
        """Σr (groups,)."""
        return np.bincount(self.group, self.fit.redundancy, len(self.groups)).astype(np.float64)

    def _inverse(self, redundancy: FloatArray) -> FloatArray:
        """F⁻¹ (groups, groups) of the groups that are estimated, 0 for the others."""
        takes_part = np.where(self.aside, -1, self.group)[self.weighted.of_system_row]
        full = information(self.fit.factor, takes_part, redundancy)
        free = np.ix_(self.free, self.free)
        inverse = np.zeros_like(full)
        inverse[free] = np.linalg.pinv(full[free])
        return inverse

    def _step(self, square: FloatArray) -> FloatArray:
        """Of ln σ² (groups,): through the information matrix where that is near, else that of each group by itself."""
        plain, redundancy = np.log(square), self._redundancy()
        self.inverse = self._inverse(redundancy)
        if np.abs(plain).max(initial=0.0) > NEAR:
            return plain
        return np.clip(self.inverse @ (redundancy / 2 * plain), -NEAR, NEAR)

    def _is_small(self, step: FloatArray) -> bool:
        sd = np.sqrt(np.diag(self.inverse))
        return bool(np.all(np.abs(step) <= self.settled * np.maximum(sd, SETTLED_AT_LEAST / SETTLED)))


def _named(adjustment: Adjustment, without: Collection[str]) -> BoolArray:
    """Which observations bear one of the sources `without`."""
    named = np.zeros(sum(len(table.observations) for table in adjustment.residuals), dtype=bool)
    if without:
        everything = sources(adjustment, ~named)
        named[[place for place, label in everything.items() if label in without]] = True
    return named


def sources(adjustment: Adjustment, aside: BoolArray) -> dict[int, str]:
    """Sources of the observations that took no part, by their place."""
    labels, first = {}, 0
    for table in adjustment.residuals:
        for row in np.flatnonzero(aside[first : first + len(table.observations)]).tolist():
            labels[first + row] = table.observations.provenance.label(row)
        first += len(table.observations)
    return labels


def _neighbours(weighted: Weighted, marks: int) -> Neighbours:
    pairs = [
        (
            np.repeat(np.arange(here.start, here.stop), block.observations.marks.shape[1]),
            block.observations.marks.ravel(),
        )
        for block, here in zip(weighted.blocks, weighted.places, strict=True)
    ]
    return Neighbours(np.concatenate([pair[0] for pair in pairs]), np.concatenate([pair[1] for pair in pairs]), marks)
