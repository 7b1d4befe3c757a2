"""Coordinates of control with their axes changed over, or those of another mark."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.mistakes.control import placed, suspected_axes, written_minus
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect
from adjust.job import Control

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
        errors = written_minus(suspect.context, suspect.mark, twice)[:, suspected_axes(suspect.context)]
        corrections = (first.correction(second.cell.text), second.correction(first.cell.text))
        what, detail = f"{pair[0]} and {pair[1]} exchanged", f"{second.cell.text} and {first.cell.text}"
        return Candidates.listed(errors, [Remedy(what, detail, corrections)]) if np.isfinite(errors).all() else None


class CoordinatesOfAnotherMark:
    """The line of another mark of the list of control."""

    name = "coordinates of another mark"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every mark held by the job: its coordinates may belong here."""
        if suspect.nature != "control":
            return None
        axes = suspected_axes(suspect.context)
        held = (suspect.job.marks.control != Control.FREE)[:, 0 if axes[0] < 2 else 1]
        marks = np.setdiff1d(np.flatnonzero(held), [suspect.mark])
        if not len(marks):
            return None
        every = suspect.job.marks.given
        given = np.where(np.isin([0, 1, 2], axes), every[marks], every[suspect.mark])
        errors = written_minus(suspect.context, suspect.mark, given)[:, axes]
        names = suspect.job.marks.names

        def remedy(place: int, error: FloatArray) -> Remedy:
            return Remedy(f"coordinates exchanged with those of {names[marks[place]]}")

        return Candidates(errors, np.full(len(marks), 1 / len(marks)), remedy)
