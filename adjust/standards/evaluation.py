"""Holding figures of marks and pairs against one requirement."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.standards.requirements import Requirement


@dataclass(frozen=True)
class Assessment:
    """One requirement held against everything it applies to.

    `figure` and `allowed` (items,) are metres; `items` (items,) are places in the arrays that were assessed: marks, or
    pairs of marks. The worst share of its allowance comes first.
    """

    requirement: Requirement
    items: IntArray
    figure: FloatArray
    allowed: FloatArray

    @property
    def share(self) -> FloatArray:
        """Figure over allowance (items,); beyond 1 it fails."""
        return self.figure / self.allowed

    @property
    def fails(self) -> BoolArray:
        """Which exceed their allowance (items,)."""
        beyond: BoolArray = self.figure > self.allowed
        return beyond

    @property
    def passed(self) -> bool | None:
        """Whether all keep within; None where there was nothing to assess."""
        return None if len(self.items) == 0 else not bool(np.any(self.fails))


def assess(requirement: Requirement, figure: FloatArray, distance: FloatArray, applies: BoolArray) -> Assessment:
    """Hold `figure` (n,) over `distance` (n,) against a requirement, metres, where `applies` (n,).

    Figures that are NaN do not exist, figures of 0 are of marks that were held; neither is assessed. Marks have a
    distance of 0. Where the distance is unknown but the rule needs it, nothing can be said, and nothing is.
    """
    allowed = requirement.rule.allowed(distance)
    items = np.flatnonzero(applies & (figure > 0) & np.isfinite(allowed))
    worst = np.argsort(-figure[items] / allowed[items], kind="stable")
    chosen = items[worst]
    return Assessment(requirement, chosen, figure[chosen], allowed[chosen])
