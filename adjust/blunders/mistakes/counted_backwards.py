"""A circle counted against the clock, a zenith angle counted from the horizon."""

from __future__ import annotations

import numpy as np

from adjust.angles import FULL_TURN
from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect


class CountedBackwards:
    """360° − the direction; 90° − an elevation that was booked as a zenith angle."""

    name = "circle counted otherwise"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The value as the usual circle would show it."""
        if suspect.kind in ("direction", "azimuth"):
            others = {"360° − the value, the circle counted backwards": (FULL_TURN, -1.0)}
        elif suspect.kind == "zenith":
            others = {
                "90° − the value, an elevation booked as a zenith angle": (np.pi / 2, -1.0),
                "90° + the value, a depression booked as a zenith angle": (np.pi / 2, 1.0),
            }
        else:
            return None
        whats = list(others)
        start, sense = np.array([*others.values()]).T
        return Candidates.together(
            [entry.valued(suspect.in_range(start + sense * entry.value), whats.__getitem__) for entry in suspect.values]
        )
