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
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache

import numpy as np
from scipy.special import betaincinv, gammainccinv

from adjust.arrays import FloatArray


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

    def price(self, sizes: Iterable[int]) -> float:
        """What hypotheses of so many columns each cost together."""
        if not self.estimated:
            return sum(chi_square_price(self.significance, size) for size in sizes)
        total, freedom = 0.0, self.freedom
        for size in sorted(sizes, reverse=True):
            total += beta_price(self.significance, size, freedom)
            freedom -= size
        return total

    def worth(self, statistic: FloatArray | float) -> FloatArray:
        """What T is worth: −T, or ln((Ω − T)/Ω)."""
        if not self.estimated:
            return -np.asarray(statistic, dtype=np.float64)
        left = np.maximum(1.0 - np.asarray(statistic) / self.square_sum, np.finfo(float).tiny)
        return np.asarray(np.log(left), dtype=np.float64)

    def critical(self, size: int, freedom: int) -> float:
        """Bound on the test of one hypothesis of so many columns with `freedom` before it: √χ² or τ-like √(f B)."""
        if not self.estimated:
            return chi_square_price(self.significance, size) ** 0.5
        share = -np.expm1(-beta_price(self.significance, size, freedom))
        return float(np.sqrt(freedom * share))
