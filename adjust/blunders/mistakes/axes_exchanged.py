"""Coordinates of control with their axes changed over."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.control import placed, written_minus
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect

PAIRS = (("easting", "northing"), ("longitude", "latitude"))


class AxesExchanged:
    """The easting in the column of northings and the reverse."""

    name = "axes exchanged"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The two coordinates changed over."""
        if suspect.nature != "control":
            return None
        entries = {entry.name: entry for entry in suspect.values}
        pair = next((pair for pair in PAIRS if set(pair) <= entries.keys()), None)
        if pair is None:
            return None
        first, second = (entries[name] for name in pair)
        given = suspect.job.marks.given[suspect.mark : suspect.mark + 1]
        once = placed(suspect.context, given, pair[0], np.array([second.value]))
        twice = placed(suspect.context, once, pair[1], np.array([first.value]))
        axes = list(suspect.context.hypothesis.given_axes(suspect.job))
        errors = written_minus(suspect.context, suspect.mark, twice)[:, axes]
        corrections = (first.correction(second.cell.text), second.correction(first.cell.text))
        what, detail = f"{pair[0]} and {pair[1]} exchanged", f"{second.cell.text} and {first.cell.text}"
        return Candidates.listed(errors, [Remedy(what, detail, corrections)]) if np.isfinite(errors).all() else None
