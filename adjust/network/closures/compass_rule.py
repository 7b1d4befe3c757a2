"""The compass rule: a traverse's misclosure shared out over its legs by their lengths."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray


@dataclass(frozen=True)
class BalancedTraverse:
    """A traverse after the compass rule; metres east and north.

    `misclosure` (2,) is where the legs lead minus where they ought to; `corrections` and `steps` (legs, 2) are those of
    each leg and the leg with them; `length` is that of all legs.
    """

    misclosure: FloatArray
    corrections: FloatArray
    steps: FloatArray
    length: float

    @property
    def linear(self) -> float:
        """Length of the misclosure."""
        return float(np.hypot(*self.misclosure))

    @property
    def precision(self) -> float:
        """N of the relative precision 1 : N; infinite where it closes exactly."""
        return self.length / self.linear if self.linear else float("inf")


def legs(azimuth: FloatArray, length: FloatArray) -> FloatArray:
    """Legs (legs, 2) east and north (departure, latitude) of azimuths, radians from north, and horizontal lengths."""
    steps: FloatArray = length[:, None] * np.column_stack([np.sin(azimuth), np.cos(azimuth)])
    return steps


def compass_rule(steps: FloatArray, length: FloatArray, arrival: FloatArray) -> BalancedTraverse:
    """Share the misclosure of legs `steps` (legs, 2), horizontal `length` (legs,), that ought to sum to `arrival` (2,).

    Each leg takes the share of its length (Bowditch 1808, *The Analyst* 1; Ghilani & Wolf, *Elementary Surveying*,
    chapter on traverse computations). A familiar comparison, never a result: it knows nothing of the angles' and
    distances' own precision.
    """
    misclosure = steps.sum(axis=0) - arrival
    total = float(length.sum())
    corrections = -misclosure * (length / total)[:, None]
    return BalancedTraverse(misclosure, corrections, steps + corrections, total)
