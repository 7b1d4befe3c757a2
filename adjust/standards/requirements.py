"""One figure of an accuracy standard: what is measured, and what it may be at most."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np

from adjust.arrays import FloatArray
from adjust.tolerances import Rule


class Measure(Enum):
    """What a requirement bounds, all at 95 %; the value says it in words."""

    MARK_PLAN = "95 % circle of a mark"
    MARK_HEIGHT = "95 % height of a mark"
    PAIR_PLAN = "semi-major axis of the relative 95 % ellipse of a pair"
    PAIR_HEIGHT = "95 % height difference of a pair"

    @property
    def of_pairs(self) -> bool:
        """Whether it is a figure of two marks."""
        return self in (Measure.PAIR_PLAN, Measure.PAIR_HEIGHT)


@dataclass(frozen=True)
class RootSum(Rule):
    """Allowed: √(constant² + (proportional · size)²), metres."""

    def allowed(self, size: FloatArray) -> FloatArray:
        """What is allowed (pairs,) over distances `size` (pairs,), metres."""
        together: FloatArray = np.hypot(self.constant, self.proportional * size)
        return together


@dataclass(frozen=True)
class Requirement:
    """A measure and the rule that bounds it; the rule's size is the distance of the pair, metres."""

    measure: Measure
    rule: Rule
