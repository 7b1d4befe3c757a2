"""What a set of errors has to explain to be believed: the price of every error, by the level of the single test.

A set S of hypotheses is judged by how far it brings down vᵀPv = Ω, and pays for every hypothesis in it:

    σ₀ known       cost = −T_S + Σ χ²(1 − α; q)                                                      (1)
    σ₀ estimated   cost = ln((Ω − T_S) / Ω) − Σ ln(1 − B(1 − α; q/2, (f' − q)/2))                    (2)

q the columns of a hypothesis, B the quantile of the beta distribution, f' the degrees of freedom before it joins. The
price is the critical value of the hypothesis's own test at significance α, χ² or the F test of Pope's τ (1976, NOAA
Technical Report NOS 65 NGS 1: T/Ω is a beta variable). So at the least cost every member of the set fails its
test given the others, and nobody else does: the set that iterated data snooping looks for, found also where the
errors mask each other. As a penalised likelihood: Hannan & Quinn (1979, *J. Royal Statistical Society* B 41)
and Schwarz (1978, *Annals of Statistics* 6) with prices of their own; here the price is set by the level of the test.

What a group shares is tested at a hundredth of α: an error of a small group can be mistaken for one of a single row of
it and the reverse, and single errors are the commoner ones.
"""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import dataclass
from functools import cache

import numpy as np
from scipy.special import betaincinv, gammainccinv

from adjust.arrays import FloatArray
from adjust.blunders.evidence import Allowed, Sort

RARER = 0.01
"""How much rarer the errors of groups are taken to be than those of single rows: common practice, no source."""


@cache
def chi_square_price(significance: float, columns: int) -> float:
    """χ²(1 − significance; columns)."""
    return float(2 * gammainccinv(columns / 2, significance))


@cache
def beta_price(significance: float, columns: int, freedom: int) -> float:
    """−ln(1 − B(1 − significance; columns/2, (freedom − columns)/2)); infinite where nothing would be left to test."""
    rest = freedom - columns
    if rest < 1:
        return np.inf
    return -float(np.log(betaincinv(rest / 2, columns / 2, significance)))


@dataclass(frozen=True)
class Criterion:
    """Prices at one significance, for σ₀ known or `estimated` from `square_sum` with `freedom` degrees."""

    significance: float
    estimated: bool
    square_sum: float
    freedom: int

    def level(self, shared: bool) -> float:
        """Significance of the test of one hypothesis."""
        return self.significance * (RARER if shared else 1.0)

    def price(self, sorts: Counter[Sort]) -> float:
        """What hypotheses of these sorts, so many of each, cost together."""
        if not self.estimated:
            return sum(
                count * chi_square_price(self.level(shared), size) for (size, shared), count in sorted(sorts.items())
            )
        total, freedom = 0.0, self.freedom
        for size, shared in sorted(sorts.elements(), reverse=True):
            total += beta_price(self.level(shared), size, freedom)
            freedom -= size
        return total

    def worth(self, statistic: FloatArray | float) -> FloatArray:
        """What T is worth: −T, or ln((Ω − T)/Ω)."""
        if not self.estimated:
            return -np.asarray(statistic, dtype=np.float64)
        left = np.maximum(1.0 - np.asarray(statistic) / self.square_sum, np.finfo(float).tiny)
        return np.asarray(np.log(left), dtype=np.float64)

    def cost(self, allowed: Allowed) -> float:
        """Equation (1) or (2) of the set that is allowed for."""
        return float(self.worth(allowed.statistic)) + self.price(allowed.sorts)

    def variance(self, statistic: float, columns: int) -> float:
        """σ₀² once errors in so many columns with this T are allowed for: 1 where it is known."""
        rest = self.freedom - columns
        return (self.square_sum - statistic) / rest if self.estimated and rest > 0 else 1.0

    def critical(self, sort: Sort, freedom: int) -> float:
        """Bound on √T of one hypothesis, over σ̂₀ where that is estimated from `freedom` degrees with it left in."""
        size, shared = sort
        if not self.estimated:
            return math.sqrt(chi_square_price(self.level(shared), size))
        return math.sqrt(-freedom * math.expm1(-beta_price(self.level(shared), size, freedom)))
