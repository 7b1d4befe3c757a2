"""Whole metres or whole tapes too few or too many."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import INTERNATIONAL_FOOT

METRES = {1.0: 3.0, 2.0: 1.0, 5.0: 1.0, 10.0: 2.0, 20.0: 2.0, 30.0: 2.0, 50.0: 2.0, 100.0: 1.0}
FEET = {1.0: 3.0, 10.0: 2.0, 50.0: 1.0, 100.0: 3.0}
"""Lengths of tapes and of what is counted along them, with how often they are lost: a guess, no source."""


class DroppedTape:
    """A tape laid once more than it was counted, a metre taken for its neighbour."""

    name = "dropped tape or whole metres"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every usual length, too few and too many."""
        if suspect.kind not in ("slope_distance", "horizontal_distance"):
            return None
        return Candidates.together([self._of_entry(entry) for entry in suspect.values])

    @staticmethod
    def _of_entry(entry: Entry) -> Candidates:
        feet = entry.notation.ending in ("ft", "usft")
        lengths, unit, sign = (FEET, INTERNATIONAL_FOOT, "ft") if feet else (METRES, 1.0, "m")
        steps = np.array([side * length for length in lengths for side in (1.0, -1.0)])
        shares = np.repeat([*lengths.values()], 2)
        sound = np.flatnonzero(entry.value + steps * unit > 0)
        return entry.valued(
            entry.value + steps[sound] * unit,
            lambda place: f"{abs(steps[sound[place]]):g} {sign} too {'few' if steps[sound[place]] > 0 else 'many'}",
            shares[sound],
        )
