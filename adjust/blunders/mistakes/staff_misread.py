"""A staff read at the wrong decimetre or metre."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import INTERNATIONAL_FOOT

STEPS = {"dm": 0.1, "m": 1.0}
FOOT_STEPS = {"tenth of a foot": INTERNATIONAL_FOOT / 10, "foot": INTERNATIONAL_FOOT}


class StaffMisread:
    """The next decimetre or metre of a staff, one way or the other."""

    name = "staff misread"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every step, up and down, of the rise or of each reading."""
        if suspect.kind != "height_difference":
            return None
        return Candidates.together([self._of_entry(entry) for entry in suspect.values])

    @staticmethod
    def _of_entry(entry: Entry) -> Candidates:
        steps = FOOT_STEPS if entry.notation.ending in ("ft", "usft") else STEPS
        names = [f"the staff read one {name} off" for name in steps for _ in range(2)]
        return entry.valued(
            entry.value + np.array([sign * step for step in steps.values() for sign in (-1.0, 1.0)]), names.__getitem__
        )
