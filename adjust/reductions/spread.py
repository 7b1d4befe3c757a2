"""Means of repeated observations, and whether their spread is what the instrument promises."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.quality import GlobalTest, global_test
from adjust.reductions.circle import group_sums


@dataclass(frozen=True)
class Repeats:
    """Means of repeated observations: `mean` and `variance` (groups,), `residual` (rows,) mean − observed."""

    mean: FloatArray
    variance: FloatArray
    residual: FloatArray


def mean_of_repeats(value: FloatArray, variance: FloatArray, group: IntArray, groups: int) -> Repeats:
    """Weighted means of the values (rows,) of each group, none empty: JCGM 100:2008, 4.2 and 5.1.2 for the variance."""
    weight = group_sums(1.0 / variance, group, groups)
    mean = group_sums(value / variance, group, groups) / weight
    return Repeats(mean, 1.0 / weight, mean[group] - value)


@dataclass(frozen=True)
class Spread:
    """How far repeated observations scatter beside what was stated of them.

    `statistic` is Σ v²/variance with `redundancy` degrees of freedom; `test` compares it with χ².
    """

    statistic: float
    redundancy: int
    test: GlobalTest

    @property
    def factor(self) -> float:
        """Spread found over spread stated; NaN without redundancy."""
        return float(np.sqrt(self.statistic / self.redundancy)) if self.redundancy else float("nan")


def spread_from(statistic: float, redundancy: int, confidence: float) -> Spread:
    """The spread of Σ v²/variance with its redundancy, tested two-sided.

    ISO 17123-1:2014, annex on statistical tests, question a: is the experimental sd no larger than the one stated?
    """
    return Spread(statistic, redundancy, global_test(statistic, redundancy, confidence))
