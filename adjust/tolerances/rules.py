"""A tolerance as a rule: what may be missed over a length, or over a number of angles."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np

from adjust.arrays import FloatArray

KILOMETRE = 1000.0


class Quantity(Enum):
    """What a tolerance is stated for; the value says it in words."""

    FACES = "pairs of faces of one setup"
    LEVEL_RUNS = "forward against backward levelling"
    LEVEL_LOOP = "level loops and lines"
    ANGLES = "angles of loops and traverses"
    TRIANGLE = "angle sums of triangles"
    STATION = "angles round one station"
    POSITION = "position closures of loops and traverses"
    DISTANCE = "distances measured twice"
    VECTOR = "vector loops and repeated vectors"


@dataclass(frozen=True)
class Rule:
    """Allowed misclosure: constant + per_root · √size + proportional · size, metres or radians.

    `size` is a length in metres, or a number of angles where the rule is one for angles. `printed` says it in the units
    of the trade, `source` who says so ("" for a figure of the job itself).
    """

    printed: str
    constant: float = 0.0
    per_root: float = 0.0
    proportional: float = 0.0
    source: str = ""
    recalled: bool = False
    """Whether the figure was written down from memory, without the page at hand."""

    def allowed(self, size: FloatArray) -> FloatArray:
        """What may be missed (closures,); NaN where the rule needs a size that is not known."""
        if not self.per_root and not self.proportional:
            return np.full_like(size, self.constant)
        return self.constant + self.per_root * np.sqrt(size) + self.proportional * size

    def __str__(self) -> str:
        origin = f" ({self.source}{', figure from memory' if self.recalled else ''})" if self.source else ""
        return f"{self.printed}{origin}"


def per_root_kilometre(metres: float) -> float:
    """The factor of √(length in metres) of a rule printed for √(length in kilometres)."""
    return float(metres / np.sqrt(KILOMETRE))
