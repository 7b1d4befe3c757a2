"""A whole degree, ten minutes or a minute miscounted."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import ARCMINUTE, DEGREE, GON

STEPS = {
    "dms": {"10°": 10 * DEGREE, "1°": DEGREE, "10′": 10 * ARCMINUTE, "1′": ARCMINUTE},
    "deg": {"10°": 10 * DEGREE, "1°": DEGREE},
    "gon": {"10 gon": 10 * GON, "1 gon": GON, "0.1 gon": GON / 10},
}
"""The graduations of a circle that are counted by eye, by the unit of the column."""


class WholeAngle:
    """A graduation of the circle taken for its neighbour."""

    name = "whole angle miscounted"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every step, up and down."""
        if not suspect.angular:
            return None
        return Candidates.together([self._of_entry(suspect, entry) for entry in suspect.values])

    @staticmethod
    def _of_entry(suspect: Suspect, entry: Entry) -> Candidates | None:
        steps = STEPS.get(entry.notation.ending, {})
        if not steps:
            return None
        names = [f"{name} miscounted" for name in steps for _ in range(2)]
        turned = entry.value + np.array([sign * step for step in steps.values() for sign in (1, -1)])
        return entry.valued(suspect.in_range(turned), names.__getitem__)
