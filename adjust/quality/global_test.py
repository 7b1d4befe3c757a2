"""Does the whole of the residuals fit the precision that was claimed beforehand?"""

from __future__ import annotations

import math
from dataclasses import dataclass

from adjust.quality.critical_values import chi_square_quantile


@dataclass(frozen=True)
class GlobalTest:
    """vᵀPv beside the bounds it should keep. Without degrees of freedom the bounds are NaN and `passed` is None."""

    statistic: float
    lower: float
    upper: float
    confidence: float
    passed: bool | None


def global_test(statistic: float, degrees_of_freedom: int, confidence: float) -> GlobalTest:
    """Two-sided χ² test of `statistic` = vᵀPv on σ₀ = 1: probability (1 − confidence)/2 is left at either end.

    Too large a value tells of blunders or of sds set too small; too small a value, of sds set too large.
    Source: Baarda (1968), as in `critical_values`; two-sided as in Ghilani, Adjustment Computations, section 5.4.
    """
    if degrees_of_freedom < 1:
        return GlobalTest(statistic, math.nan, math.nan, confidence, None)
    tail = (1 - confidence) / 2
    lower = chi_square_quantile(tail, degrees_of_freedom)
    upper = chi_square_quantile(1 - tail, degrees_of_freedom)
    return GlobalTest(statistic, lower, upper, confidence, lower <= statistic <= upper)
