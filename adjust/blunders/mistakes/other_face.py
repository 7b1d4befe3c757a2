"""A reading of the other face, or of the other end of the line: half a turn off."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect


class OtherFace:
    """180° too much or too little."""

    name = "other face"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The value half a turn on."""
        if suspect.kind not in ("direction", "angle", "azimuth"):
            return None
        turned = [(entry, suspect.in_range(np.array([entry.value + np.pi]))) for entry in suspect.values]
        return Candidates.together([entry.valued(values, lambda place: "180° off") for entry, values in turned])
