"""Which observations stand too far off to take part in judging their group.

Forward, with suspicion: an observation is set aside where T is far beyond the smallest of three scales of its group,
that of the bounded residuals, that of the median, and that of all others; of those that share a mark only the worst,
because the next fit says what remains of its neighbours. Backward, with care: judged from outside, by what the others
say of it, one that keeps within its bound takes part again, and for good. So what one blunder hides comes out, and what
it made look wrong comes back.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.quality import chi_square_quantile
from adjust.variance_components.fit import Fit

FAR = 4.0
"""Sds of a single residual: bounded influence copes with what is nearer."""

BY_CHANCE = float(2 * ndtr(-FAR))
"""One in sixteen thousand."""

LEAST_SHARE = 1e-3
"""Of the variance of a group that is left to judge by: exact data must not make every residual infinite."""


@dataclass(frozen=True)
class Neighbours:
    """The marks of each observation as pairs: entry `mark[i]` belongs to observation `observation[i]`."""

    observation: IntArray
    mark: IntArray
    marks: int

    def is_worst(self, far: FloatArray) -> BoolArray:
        """Whether each observation's figure (observations,) is the largest on all its marks; of equal ones, as those
        of two that only check each other, it is the first in the book."""
        order = np.empty(len(far), dtype=np.int64)
        order[np.argsort(-far, kind="stable")] = np.arange(len(far))
        first = np.full(self.marks, len(far))
        np.minimum.at(first, self.mark, order[self.observation])
        worst = np.ones(len(far), dtype=bool)
        worst[self.observation[order[self.observation] > first[self.mark]]] = False
        return worst


def set_aside(fit: Fit, square: FloatArray, group: IntArray, may_go: BoolArray, neighbours: Neighbours) -> BoolArray:
    """Which of the observations `may_go` to set aside now; `square` (groups,) is s² of each group."""
    far = np.where(may_go, fit.test / (smallest_square(fit, square, group) * _bounds(fit)), 0.0)
    far[far <= 1.0] = 0.0
    return (far > 0.0) & neighbours.is_worst(far)


def smallest_square(fit: Fit, square: FloatArray, group: IntArray) -> FloatArray:
    """The smallest of the three variances that the group of each observation may have without it (observations,)."""
    freedom = np.bincount(group, fit.redundancy, len(square))[group] - fit.checked
    energy = np.bincount(group, fit.energy, len(square))[group]
    with np.errstate(invalid="ignore", divide="ignore"):
        others = np.where(freedom >= 1.0, (energy - fit.test) / freedom, np.inf)
    smallest = np.minimum(np.minimum(square, _by_median(fit, group, len(square)))[group], others)
    return np.maximum(smallest, LEAST_SHARE * square[group])


def _by_median(fit: Fit, group: IntArray, groups: int) -> FloatArray:
    """s² (groups,) by the median of T over that of χ², which half of the observations leave alone (Hampel 1974,
    *J. American Statistical Association* 69, 383–393); infinite where a group has none."""
    square = np.full(groups, np.inf)
    taking_part = (fit.checked > 0) & (fit.redundancy > 0)
    relative = fit.test / _quantiles(0.5)[fit.checked]
    for number in range(groups):
        here = taking_part & (group == number)
        if here.any():
            square[number] = np.median(relative[here])
    return square


def taken_back(fit: Fit, square: FloatArray, group: IntArray, aside: BoolArray) -> BoolArray:
    """Observations set aside whose distance from what the others say keeps within its bound, on the scale of those."""
    return aside & (fit.test <= square[group] * _bounds(fit))


def _bounds(fit: Fit) -> FloatArray:
    """What T (observations,) may be on the scale of its group: the value that χ² passes `BY_CHANCE`."""
    bounds: FloatArray = _quantiles(1.0 - BY_CHANCE)[fit.checked]
    return bounds


def _quantiles(probability: float) -> FloatArray:
    """χ² of 0, 1, 2, 3 degrees of freedom; infinite for none, so that nothing is far from nowhere."""
    return np.array([np.inf, *(chi_square_quantile(probability, size) for size in (1, 2, 3))])
